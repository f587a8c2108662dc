// SPDX-License-Identifier: Apache-2.0
// The families behind IonDistribution; its users see only ions.hpp.
#pragma once

#include "geometry/vec.hpp"

#include <variant>
#include <vector>

namespace rille::fluxes {

struct ThermalFall {
    double drop_ev, transverse_ev, normal_ev;
};
struct IonHistogram {
    std::vector<double> energy;                  ///< edges [eV]
    std::vector<double> cosine;                  ///< edges, decreasing from the surface normal
    std::vector<std::vector<double>> weight;     ///< [energy bin][angle bin], sum 1
    std::vector<double> angle_cdf;               ///< at the angle edges
    std::vector<std::vector<double>> energy_cdf; ///< [angle bin] at the energy edges
};
struct IonBeam {
    double energy_ev;
    geometry::Vec3 direction;
};
struct GaussianSlopes {
    double energy_ev, tan_sigma;
};
using IonLaw = std::variant<ThermalFall, IonHistogram, IonBeam, GaussianSlopes>;

} // namespace rille::fluxes
