// SPDX-License-Identifier: Apache-2.0
// The families behind IonDistribution; its users see only ions.hpp.
#pragma once

#include "fluxes/ions.hpp"
#include "geometry/vec.hpp"

#include <array>
#include <memory>
#include <variant>
#include <vector>

namespace rille::fluxes {

/// A running sum from 0 to 1 with, for even steps of it, the first entry above.
struct RunningSum {
    std::vector<double> value;
    std::vector<int> above; ///< index of the first value above k / above.size()

    RunningSum() = default;
    explicit RunningSum(std::vector<double> running);
};
struct ThermalFall {
    double drop_ev, transverse_ev, normal_ev;
};
struct IonHistogram {
    std::vector<double> energy;              ///< edges [eV]
    std::vector<double> cosine;              ///< edges, decreasing from the surface normal
    std::vector<std::vector<double>> weight; ///< [energy bin][angle bin], sum 1
    RunningSum angle_cdf;                    ///< at the angle edges
    std::vector<RunningSum> energy_cdf;      ///< [angle bin] at the energy edges
};
struct IonBeam {
    double energy_ev;
    geometry::Vec3 direction;
};
struct GaussianSlopes {
    double energy_ev, tan_sigma;
};
/// Normal energies in bins, each uniform inside; exponential transverse energy.
struct FallingSpectrum {
    std::vector<double> energy; ///< edges of the normal energy [eV]
    std::vector<double> cdf;    ///< at the edges, 0 to 1
    double transverse_ev;
};
struct IonMixture {
    std::vector<double> weight; ///< sum 1
    std::vector<double> cdf;    ///< running sum, one longer than weight
    std::vector<IonDistribution> part;
};

/// Ions of one energy between two azimuths: a piece of the quadrature of a distribution.
struct IonArc {
    Vec3 from, to; ///< unit directions at its ends
    double energy_ev, weight;
};
/// Turns the wafer normal by `tilt` towards an azimuth.
struct Lean {
    double sine, cosine;         ///< of the tilt
    double towards_x, towards_y; ///< unit vector of the azimuth

    Vec3 turned(const Vec3& direction) const;
};
struct TiltedIons {
    IonDistribution upright;
    double tilt_deg, azimuth_deg;
    Lean lean;
    double kept; ///< share of the turned ions that still fly down
    std::shared_ptr<const std::vector<IonArc>> arcs; ///< of the turned and kept ions, sum 1
    /// Tangents of the polar angles at both ends and in the middle of each arc.
    std::shared_ptr<const std::vector<std::array<double, 3>>> tangents;
};
using IonLaw = std::variant<ThermalFall, IonHistogram, IonBeam, GaussianSlopes, FallingSpectrum,
                            IonMixture, TiltedIons>;

/// Ions closer to the wafer plane than this (cosine of the polar angle, half a degree) do not reach
/// the wafer after a tilt.
constexpr double lowest_cosine = 0.01;

IonSample sample_law(const IonLaw&, const std::array<double, 4>& u);
double mean_energy_of(const IonLaw&);
/// Share within a polar angle below 90 deg, given by its tangent.
double share_within(const IonLaw&, double tangent);
/// Appends the numbers that define a law.
void append_law(const IonLaw&, std::vector<double>& numbers);
std::vector<IonSpread> spreads_of(const IonLaw&, const IonDistribution& whole);
/// Deterministic quadrature of a law, weights sum 1.
std::vector<IonArc> arcs_of(const IonLaw&);
Lean lean_towards(double tilt_deg, double azimuth_deg);
/// For laws that are neither a beam nor a mixture: those turn as a whole and part by part.
TiltedIons tilt_ions(const IonDistribution& upright, double tilt_deg, double azimuth_deg);

} // namespace rille::fluxes
