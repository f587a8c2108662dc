// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "fluxes/in_plane.hpp"
#include "fluxes/yields.hpp"

#include <cstddef>
#include <vector>

namespace rille::fluxes {

/// The angular factor of a yield at nodes even in sqrt(1 - cosine), in which every law is smooth
/// up to a kink: near normal incidence that is the angle itself, near grazing incidence the cosine.
/// Straight in between: within 2e-5 of the law's peak.
class AngleTable {
public:
    explicit AngleTable(const AngleLaw&);
    /// `cosine` of the angle of incidence, above 0; held at 1 beyond.
    double operator()(double cosine) const;

private:
    std::vector<double> value_;
};

/// What the ions of a distribution do by one yield, apart from its angular factor: few rays a bin
/// of in-plane angle. Nodes of about one angle out of the plane are joined whatever their energies,
/// each weighted by the yield of its spectrum, so that nothing is lost of how yields and angles go
/// together. Sum and mean slope of the rays are exact; what is lost is the curvature of the angular
/// factor over the half to few degrees that are joined: 1e-4 of what the surface receives.
class GatheredIons {
public:
    /// `per_spectrum`: yield of each spectrum of the nodes.
    GatheredIons(const InPlane&, const std::vector<double>& per_spectrum);

    std::size_t bins() const { return first_.size() - 1; }
    /// Sum over a bin on a surface whose normal leans by an angle of this cosine and sine.
    double on_surface(std::size_t bin, double cosine, double sine, const AngleTable&) const;

private:
    struct Ray {
        double slope, cos_polar, weight;
    };
    std::vector<std::size_t> first_; ///< ray of each bin, one more at the end
    std::vector<Ray> rays_;
};

} // namespace rille::fluxes
