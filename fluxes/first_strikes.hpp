// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "fluxes/direct_ions.hpp"
#include "fluxes/exchange.hpp"
#include "fluxes/open_sky.hpp"
#include "fluxes/plane_table.hpp"
#include "fluxes/sampling.hpp"
#include "geometry/domain.hpp"
#include "geometry/surface.hpp"

#include <array>
#include <cstdint>
#include <variant>
#include <vector>

namespace rille::fluxes {

/// An ion where it comes straight from the sheath onto an element.
struct Strike {
    int element = -1; ///< -1: drawn, but nothing arrives there
    Vec3 point;
    Vec3 normal; ///< of the surface at that point
    IonSample ion;
    double carried =
        0; ///< flux times area that it stands for in its batch [s^-1]; extruded: per nm
    /// For the scatter of its reflection: the numbers whose pairing with the place of contact
    /// spreads the next contacts most evenly.
    std::array<double, 2> scatter{};
};

/// Bounds of the reflection probability by material and cosine of incidence; guides the sampling.
/// Probabilities fall with the cosine, so the value at the next lower node is a bound.
class ReflectionBound {
public:
    explicit ReflectionBound(const std::vector<IonReflection>&);
    double operator()(int material, double cosine) const {
        const double at = cosine <= 0 ? 0 : cosine >= 1 ? cells : cosine * cells;
        return table_[std::size_t(material) * (cells + 1) + static_cast<std::size_t>(at)];
    }

private:
    static constexpr int cells = 4096;
    std::vector<double> table_;
};

/// What the drawing of strikes rests on; everything outlives it.
struct StrikeScene {
    const geometry::Domain& domain;
    const geometry::Surface& surface;
    const std::vector<int>& material; ///< per element
    const std::vector<Vec3>& normal;  ///< averaged, per element
    const ReflectionBound& bound;
    const DirectIons& direct;
};

/// Strikes drawn in proportion to (direct flux) x (bound of the reflection probability), so that
/// every ion stands for about the same reflected flux and none is spent where nothing reflects.
/// extruded: over (arc length, in-plane angle) with the visible sky found exactly at each place; a
/// strike carries what its place and angle really receive, so the mean is that of the exact direct
/// flux.
class ExtrudedStrikes {
public:
    explicit ExtrudedStrikes(const StrikeScene&);

    /// Bound of the flux times area that reflects at first contact [s^-1 per nm].
    double total(int ion, int batch) const;
    /// Ion `index` of `count` in a batch; `points` is the batch's stream (pairs 0 to 2 are used).
    Strike draw(int ion, int batch, const ScrambledPoints& points, std::uint32_t index,
                int count) const;

private:
    struct Sky { ///< of an element: what any of its places may see, what every one sees
        Visible any, every;
    };
    struct Bins { ///< in-plane bins that an element may receive ions from
        InPlane::Place low, high;
        std::vector<double> below; ///< running sums of the guide, one more than bins
        double from(int b) const { return b == low.bin ? low.part : 0.0; }
        double width(int b) const { return (b == high.bin ? high.part : 1.0) - from(b); }
    };
    struct Guide {
        const PlaneTable* table = nullptr; ///< of the ion tables
        std::vector<Bins> element;
        std::vector<double> below; ///< running sums over elements, one more than elements
    };
    Sky sky_over(int element) const;
    bool sees(int element, double part, double phi) const;
    Bins guide_of(const InPlane&, const PlaneTable&, int element) const;

    const StrikeScene& scene_;
    OpenSky sky_;
    std::vector<Sky> over_;    ///< per element; of those that reflect nothing it is empty
    std::vector<Guide> guide_; ///< per ion species
};

/// full and revolved: drawn from the rays by which the direct flux was gathered, batch by batch, so
/// that noise of the direct flux and of what it reflects belong together.
class FullStrikes {
public:
    explicit FullStrikes(const StrikeScene&);
    double total(int ion, int batch) const;
    Strike draw(int ion, int batch, const ScrambledPoints& points, std::uint32_t index,
                int count) const;

private:
    /// What a ray brings to its element times the bound of the reflection probability there.
    double guide(const Launcher&, int group, int element, int batch, int ray) const;
    const std::vector<double>& below(int ion, int batch) const {
        return below_[scene_.direct.group_of(ion) * batches + batch];
    }

    const StrikeScene& scene_;
    /// [group * 8 + batch]: running sums over elements, in units of the open flux.
    std::vector<std::vector<double>> below_;
};

using FirstStrikes = std::variant<ExtrudedStrikes, FullStrikes>;

} // namespace rille::fluxes
