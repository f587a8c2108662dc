// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "fluxes/ions.hpp"

#include <vector>

namespace rille::engine {

/// The figures of one distribution at the wafer, all weighted by flux.
struct DistributionFigures {
    double mean_ev = 0;
    double low_ev = 0, high_ev = 0; ///< energies below which 5 % and 95 % of the particles lie
    double median_deg = 0;          ///< of the angle from the wafer normal
    /// Full width of the flux per solid angle at half of its value along the normal [deg].
    double fwhm_deg = 0;
};
DistributionFigures figures_of(const fluxes::IonDistribution&);

/// A histogram of shares, sum 1.
struct Spectrum {
    std::vector<double> edges;
    std::vector<double> share;
};
/// Energies in even bins of `width_ev`, from 0 to above the fastest particle.
Spectrum energy_spectrum(const fluxes::IonDistribution&, double width_ev);
/// Joint shares in bins of energy and angle [energy][angle].
struct JointSpectrum {
    std::vector<double> energy_edges_ev, angle_edges_deg;
    std::vector<std::vector<double>> share;
};
/// Bins by quantiles of both: each row and column of bins holds about as many particles.
JointSpectrum joint_spectrum(const fluxes::IonDistribution&, int energy_bins, int angle_bins);

} // namespace rille::engine
