// SPDX-License-Identifier: Apache-2.0
#include "engine/sheath_figures.hpp"

#include "fluxes/sampling.hpp"

#include <algorithm>
#include <cmath>

namespace rille::engine {

namespace {

constexpr double degree = 3.14159265358979323846 / 180;
/// Low-discrepancy points; shares of bins are then good to about 1e-4.
constexpr std::uint32_t samples = 1u << 17;

struct Drawn {
    std::vector<double> energy_ev, angle_deg;
};

Drawn draw(const fluxes::IonDistribution& ions) {
    const fluxes::ScrambledPoints points(fluxes::stream_key(1));
    Drawn drawn;
    for (std::uint32_t i = 0; i < samples; ++i) {
        const fluxes::IonSample ion = ions.sample(points.four(i));
        drawn.energy_ev.push_back(ion.energy_ev);
        drawn.angle_deg.push_back(
            std::atan2(std::hypot(ion.direction.x, ion.direction.y), -ion.direction.z) / degree);
    }
    return drawn;
}

double quantile(std::vector<double>& sorted, double share) {
    const auto place = static_cast<std::size_t>(share * static_cast<double>(sorted.size()));
    return sorted[std::min(place, sorted.size() - 1)];
}

/// Angle from the normal at which the flux per solid angle is half of that near the normal. Near
/// the normal means: within the angle that holds a tenth of the flux.
double half_width_deg(const fluxes::IonDistribution& ions) {
    const auto angle_of = [&](double share) {
        double low = 0, high = 90;
        for (int i = 0; i < 50; ++i) {
            const double middle = 0.5 * (low + high);
            (ions.share_within_deg(middle) < share ? low : high) = middle;
        }
        return 0.5 * (low + high);
    };
    const double core = angle_of(0.1);
    if (!(core > 1e-6)) return 0; // a beam
    const auto density = [&](double low, double high) {
        return (ions.share_within_deg(high) - ions.share_within_deg(low)) /
               (std::cos(low * degree) - std::cos(high * degree));
    };
    // Inside the core the density falls by a share x of 1 - 0.1 / 2, to first order.
    const double half = 0.5 * density(0, core) / 0.95;
    double low = core, high = 90;
    for (int i = 0; i < 50; ++i) {
        const double middle = 0.5 * (low + high);
        const double reach = std::min(0.3 * core, 90 - middle);
        (density(middle - reach, middle + reach) > half ? low : high) = middle;
    }
    return 0.5 * (low + high);
}

/// Edges between equal numbers of sorted values, strictly increasing, both ends included.
std::vector<double> quantile_edges(const std::vector<double>& sorted, int bins, double first,
                                   double last) {
    std::vector<double> edges = {first};
    for (int b = 1; b <= bins; ++b) {
        // The last bin holds half a per cent, so that readers do not take the table for cut off.
        const double share = b < bins ? static_cast<double>(b) / bins : 0.995;
        const double edge = sorted[static_cast<std::size_t>(share * sorted.size())];
        if (edge > edges.back() * (1 + 1e-9) + 1e-9 && edge < last * (1 - 1e-9))
            edges.push_back(edge);
    }
    edges.push_back(last);
    return edges;
}

std::size_t bin_of(const std::vector<double>& edges, double value) {
    const auto above = std::upper_bound(edges.begin(), edges.end(), value);
    const auto bin = std::max<std::ptrdiff_t>(1, above - edges.begin()) - 1;
    return std::min<std::size_t>(bin, edges.size() - 2);
}

} // namespace

DistributionFigures figures_of(const fluxes::IonDistribution& ions) {
    Drawn drawn = draw(ions);
    std::sort(drawn.energy_ev.begin(), drawn.energy_ev.end());
    DistributionFigures figures;
    figures.mean_ev = ions.mean_energy_ev();
    figures.low_ev = quantile(drawn.energy_ev, 0.05);
    figures.high_ev = quantile(drawn.energy_ev, 0.95);
    figures.median_deg = ions.median_angle_deg();
    figures.fwhm_deg = 2 * half_width_deg(ions);
    return figures;
}

Spectrum energy_spectrum(const fluxes::IonDistribution& ions, double width_ev) {
    const Drawn drawn = draw(ions);
    const double highest = *std::max_element(drawn.energy_ev.begin(), drawn.energy_ev.end());
    const auto bins = static_cast<std::size_t>(highest / width_ev) + 2;
    Spectrum spectrum;
    for (std::size_t b = 0; b <= bins; ++b)
        spectrum.edges.push_back(static_cast<double>(b) * width_ev);
    spectrum.share.assign(bins, 0);
    for (const double energy : drawn.energy_ev)
        spectrum.share[static_cast<std::size_t>(energy / width_ev)] += 1.0 / samples;
    return spectrum;
}

JointSpectrum joint_spectrum(const fluxes::IonDistribution& ions, int energy_bins, int angle_bins) {
    const Drawn drawn = draw(ions);
    std::vector<double> energy = drawn.energy_ev, angle = drawn.angle_deg;
    std::sort(energy.begin(), energy.end());
    std::sort(angle.begin(), angle.end());
    JointSpectrum joint;
    joint.energy_edges_ev =
        quantile_edges(energy, energy_bins, 0.999 * energy.front(), 1.001 * energy.back() + 1e-6);
    joint.angle_edges_deg =
        quantile_edges(angle, angle_bins, 0, std::min(90.0, 1.001 * angle.back() + 1e-6));
    joint.share.assign(joint.energy_edges_ev.size() - 1,
                       std::vector<double>(joint.angle_edges_deg.size() - 1, 0.0));
    for (std::size_t i = 0; i < drawn.energy_ev.size(); ++i)
        joint.share[bin_of(joint.energy_edges_ev, drawn.energy_ev[i])]
                   [bin_of(joint.angle_edges_deg, drawn.angle_deg[i])] += 1.0 / samples;
    return joint;
}

} // namespace rille::engine
