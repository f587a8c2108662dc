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

struct InPlane; // ion distribution seen in the plane of a trench: in_plane.hpp

/// Joint distribution of energy and direction of one ion species at the wafer, as a FLUX
/// distribution through the wafer plane (no further cosine belongs to it). Azimuthally symmetric
/// about the wafer normal, apart from `beam`. A value; copies share their data.
class IonDistribution {
public:
    /// Collisionless sheath: energy gain `drop_ev` (sheath voltage plus Te/2), transverse and
    /// normal temperature [eV] at the sheath edge. Et = -Tperp ln u1, Ez = drop - Tpar ln u2
    /// (thermal ions in free fall; derived from Liouville's theorem). All >= 0, drop + normal > 0,
    /// else std::invalid_argument. drop = 0 with equal temperatures is the cosine law.
    static IonDistribution thermal_fall(double drop_ev, double transverse_ev, double normal_ev);
    /// Histogram: weight[e][a] = share of the flux in energy bin e and polar-angle bin a. Inside a
    /// bin uniform in energy and in cos(angle). Edges strictly increasing; angles in deg from the
    /// surface normal, [0, 90]. Weights are normalised to sum 1. Throws std::invalid_argument.
    static IonDistribution histogram(std::vector<double> energy_edges_ev,
                                     std::vector<double> angle_edges_deg,
                                     std::vector<std::vector<double>> weight);
    /// Ions that fell through a sheath: energy of the motion along the normal in bins (uniform
    /// inside a bin, `share` sums to 1 after normalising), transverse energy exponential with
    /// `transverse_ev`. Edges strictly increasing and >= 0. Throws std::invalid_argument.
    static IonDistribution falling_spectrum(std::vector<double> normal_energy_edges_ev,
                                            std::vector<double> share, double transverse_ev);
    /// Flux-weighted sum of distributions; weights >= 0, not all zero, normalised to sum 1.
    static IonDistribution mixture(std::vector<double> weight, std::vector<IonDistribution>);
    /// The same ions leaning by `tilt_deg` (0 to 45) from the wafer normal, towards `azimuth_deg`
    /// from +x to +y: an ion along the normal then travels towards that azimuth. What would come
    /// from below the wafer plane is dropped and the rest normalised.
    IonDistribution tilted(double tilt_deg, double azimuth_deg) const;
    /// All ions at one energy along one direction (tests, tilted beams). Needs direction.z < 0.
    static IonDistribution beam(double energy_ev, const Vec3& direction);
    /// Slopes tan(theta_x), tan(theta_y) normal with standard deviation tan_sigma, one energy.
    static IonDistribution gaussian(double energy_ev, double tan_sigma);

    /// Inverse-CDF sample from four numbers in [0, 1): polar angle, azimuth, energy, spare.
    IonSample sample(const std::array<double, 4>& u) const;
    double mean_energy_ev() const;
    /// Share of the flux within polar angle `angle_deg` of the wafer normal.
    double share_within_deg(double angle_deg) const;
    /// Median of the polar angle [deg].
    double median_angle_deg() const;
    /// Mean and standard deviation of the in-plane angle [rad], for placing angle nodes.
    double mean_rad() const;
    double spread_rad() const;
    /// Appends the numbers that define the distribution; equal numbers, equal distribution.
    void append_content(std::vector<double>& numbers) const;
    /// Resolved by in-plane angle: quadrature nodes for everything that a trench needs.
    const InPlane& in_plane() const;

private:
    struct Impl;
    explicit IonDistribution(std::shared_ptr<const Impl>);
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
