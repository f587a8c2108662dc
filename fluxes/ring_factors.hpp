// SPDX-License-Identifier: Apache-2.0
// Private to fluxes.
#pragma once

#include "fluxes/patches.hpp"
#include "fluxes/ring_kernel.hpp"
#include "fluxes/taut_strings.hpp"
#include "geometry/domain.hpp"
#include "geometry/surface.hpp"

#include <cmath>
#include <vector>

namespace rille::fluxes {

/// The profile of a round hole, from the axis to the side of its cell, and what stands between
/// places on it.
///
/// A straight line in space stays, at every height, at most as far from the axis as the straight
/// line between its ends in the half-plane does. So where that half-plane shows two places to each
/// other, and no solid lies nearer to the axis, nothing stands between them at any azimuth: then
/// discs spanned by the ends of patches give their exchange in closed form. Elsewhere it is
/// integrated over the azimuths that nothing hides.
class RoundProfile {
public:
    /// Whether the profile is of the kind that is treated: outside the hole it is as high as
    /// anywhere (within a twentieth of a cell), so that the side of the cell shows nothing but sky,
    /// and no piece floats in the gas.
    static bool serves(const geometry::Domain&, const geometry::Surface&);

    RoundProfile(const geometry::Domain&, const geometry::Surface&);

    /// Elements in walking order, from the axis on.
    const std::vector<int>& order() const { return order_; }
    /// The vertex, by its number in the order, at which the flat outside begins.
    int rim() const { return rim_; }
    /// Direct flux of an element by its place in the order, relative to the open one.
    double sky(int place) const;
    /// As PatchFactors::exchange [nm^2].
    std::vector<double> factors(const Patches&) const;

private:
    bool is_clear(double low, double high) const;
    bool is_open_disc(int vertex) const;
    std::vector<int> strings_to(int vertex) const;
    struct Chord {
        PlanePoint start, end;
        PlanePoint at(double part) const {
            return {start.x + part * (end.x - start.x), start.z + part * (end.z - start.z)};
        }
        double measure() const { ///< integral of the radius over the length
            const double x = end.x - start.x, z = end.z - start.z;
            return 0.5 * (start.x + end.x) * std::sqrt(x * x + z * z);
        }
    };
    struct Between {
        BetweenRings rings;
        std::vector<CosineRange> scratch;
    };
    BetweenRings what_stands_between() const;
    double by_discs(int place) const;
    double by_horizons(const RingPoint& from, int place) const;
    double by_windows(const RingPoint& from, int place) const;
    double by_azimuths(const Patches&, int i, int j, const std::vector<int>& next) const;
    double integrate(const Chord& from, const Chord& to, int halvings, Between&) const;
    RingPoint on_chord(int first, int last, double part) const;

    std::vector<int> order_;
    std::vector<PlanePoint> point_; ///< one more than elements
    std::vector<double> area_;      ///< per place [nm^2]
    double tolerance_ = 0;          ///< heights this close count as one [nm]
    double top_ = 0;                ///< height of the highest vertex
    int rim_ = 0;                   ///< first vertex as high as that
    int bottom_ = 0;                ///< the lowest vertex, or one as low nearer to the axis
    bool bore_ = false;             ///< whether it only falls before that and only rises after
    bool rising_ = false;           ///< whether it only rises
    std::vector<int> to_rim_;       ///< strings_to(rim)
    std::vector<int> every_;        ///< the next vertex of each
};

} // namespace rille::fluxes
