// SPDX-License-Identifier: Apache-2.0
// Private to fluxes.
#pragma once

#include "geometry/domain.hpp"
#include "geometry/ray_caster.hpp"
#include "geometry/surface.hpp"

#include <array>
#include <vector>

namespace rille::fluxes {

/// How long patches are. An element is never cut.
struct PatchSizes {
    double growth = 0.2;    ///< of the distance to the nearest corner
    double gap_share = 0.3; ///< of the free path along the normal, at most
    double turn = 0.2;      ///< [rad] between the ends of a patch, at most
};

/// The part of a profile that is open to the source (extruded or revolved), cut into patches of
/// consecutive elements: short next to corners and in narrow places, of one material each, never
/// across a corner.
class Patches {
public:
    /// material: per element, or empty. `ends`: vertices of the open part at which a patch must
    /// end, by number in walking order (vertex k lies before element order[k]).
    Patches(const geometry::Surface&, const geometry::RayCaster&, std::vector<int> order,
            const std::vector<int>& material, const std::vector<int>& ends, const PatchSizes&);

    std::size_t size() const { return area_.size(); }
    /// Elements in walking order; patch p holds order()[first(p)] to order()[first(p + 1) - 1].
    const std::vector<int>& order() const { return order_; }
    int first(std::size_t p) const { return first_[p]; }
    int patch_of(int element) const { return patch_[element]; } ///< -1: not open to the source
    int place_of(int element) const { return place_[element]; } ///< in order(), or -1
    double area(std::size_t p) const { return area_[p]; }
    double element_area(int e) const { return element_area_[e]; }

    /// patch = mean over the area of the patch, of values per element.
    void average(const double* element, double* patch) const;
    /// Says which share of an element's view is filled by other elements, in [0, 1]: what arrives
    /// from there is that share times a smooth mean emission of what is seen.
    void set_view(const geometry::Surface&, std::vector<double> share);
    /// element += arrivals from other elements, given by their means over patches: the mean
    /// emission seen is a parabola through three patches of one smooth piece; means are kept.
    void spread(const double* patch, double* element) const;
    /// The transposed: patch = sum over places in the walking order of place[k] times the weight
    /// that spread gives the patch there.
    void project(const double* place, double* patch) const;

private:
    struct Part { ///< value of an element = sum of weight[k] mean of patch + k
        int patch = 0;
        std::array<double, 3> weight{};
    };
    std::vector<double> lengths_wanted(const geometry::Surface&, const geometry::RayCaster&,
                                       const PatchSizes&) const;
    void divide(const geometry::Surface&, const std::vector<double>& wanted,
                const std::vector<char>& breaks, const PatchSizes&);
    void set_parts(int from, int to, const std::vector<double>& place);

    std::vector<int> order_, first_, patch_, place_;
    std::vector<double> area_;         ///< per patch
    std::vector<double> element_area_; ///< per element
    std::vector<char> corner_;         ///< per vertex in walking order
    std::vector<double> view_;         ///< per element: share filled by others
    std::vector<Part> part_;           ///< in walking order
};

} // namespace rille::fluxes
