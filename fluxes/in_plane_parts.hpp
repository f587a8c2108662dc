// SPDX-License-Identifier: Apache-2.0
// The ways of resolving a distribution by in-plane angle; used through resolve_in_plane.
#pragma once

#include "fluxes/in_plane.hpp"

#include <cmath>
#include <functional>
#include <vector>

namespace rille::fluxes {

/// One value of the normal energy: normal slopes of standard deviation sigma.
struct Layer {
    double normal_ev, weight, sigma;
};

/// Flux shares beyond the edges of the upper half: steps of 1/256, in the tail of an eighth of what
/// is left, down to 1e-8. A bin then errs by less than 1e-4 of the flux and 0.2 % of its own tail.
std::vector<double> tail_levels();

/// Edges of a distribution even in phi, from its share above phi > 0; `largest` ends the support.
std::vector<double> symmetric_edges(const std::function<double(double)>& share_above,
                                    double largest, double precision = 1e-14);

/// Slope at an edge; 90 deg stands for infinity.
double slope_of(double phi);

/// Running sums at the edges from the nodes, so that tables and nodes agree to round-off.
void sum_up(InPlane&);

/// Every ion at one slope: a bin too narrow to be seen.
InPlane single_slope(double slope_x, double slope_y, std::vector<InPlane::EnergyShare>);

/// Layers of nearly one spread, next to each other, share the nodes of a bin; the energies stay
/// apart in their spectrum. fixed_energy: the layer's energy is that of the whole motion.
InPlane from_layers(const std::vector<Layer>&, bool fixed_energy);
InPlane from_thermal_fall(const ThermalFall&);
InPlane from_spectrum(const FallingSpectrum&);
InPlane from_mixture(const IonMixture&);
InPlane from_arcs(const std::vector<IonArc>&);

} // namespace rille::fluxes
