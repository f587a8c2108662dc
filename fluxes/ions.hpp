// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "geometry/vec.hpp"

#include <array>
#include <memory>
#include <string>
#include <vector>

namespace rille::fluxes {

using geometry::Vec3;

/// Energy and direction of one ion at the wafer. direction: unit, direction.z < 0.
struct IonSample {
    double energy_ev = 0;
    Vec3 direction;
};

/// Joint distribution of energy and direction of one ion species at the wafer, as a FLUX
/// distribution through the wafer plane (no further cosine belongs to it). Azimuthally symmetric
/// about its mean direction.
class IonDistribution {
  public:
    /// Collisionless sheath: energy gain `drop_ev` (sheath voltage plus Te/2), transverse and normal
    /// temperature [eV] at the sheath edge. Et = -Tperp ln u1, Ez = drop - Tpar ln u2 (thermal
    /// ions in free fall; derived from Liouville's theorem). drop_ev > 0, temperatures >= 0.
    static IonDistribution thermal_fall(double drop_ev, double transverse_ev, double normal_ev);
    /// Histogram: weight[e][a] = share of the flux in energy bin e and polar-angle bin a. Inside a
    /// bin uniform in energy and in cos(angle). Edges strictly increasing; angles in deg from the
    /// surface normal, [0, 90]. Weights are normalised to sum 1.
    static IonDistribution histogram(std::vector<double> energy_edges_ev,
                                     std::vector<double> angle_edges_deg,
                                     std::vector<std::vector<double>> weight);
    /// All ions at one energy along one direction (tests, tilted beams).
    static IonDistribution beam(double energy_ev, const Vec3& direction);
    /// Slope tan(theta_x), tan(theta_y) normal with standard deviation tan_sigma, one energy.
    static IonDistribution gaussian(double energy_ev, double tan_sigma);

    /// Inverse-CDF sample from four numbers in [0, 1).
    IonSample sample(const std::array<double, 4>& u) const;
    double mean_energy_ev() const;
    /// Median of the polar angle [deg].
    double median_angle_deg() const;
    /// Standard deviation of the in-plane angle [rad], for placing angle nodes.
    double spread_rad() const;

  private:
    struct Impl;
    std::shared_ptr<const Impl> impl_;
};

/// One ion species arriving at the open wafer surface.
struct IonSource {
    std::string name;
    double mass_amu = 0;
    double flux = 0; ///< through the wafer plane [nm^-2 s^-1]
    IonDistribution distribution = IonDistribution::beam(1, Vec3(0, 0, -1));
};

/// One neutral species arriving at the open wafer surface with the cosine law.
struct NeutralSource {
    std::string name;
    double flux = 0; ///< [nm^-2 s^-1]
    double temperature_k = 300;
};

} // namespace rille::fluxes
