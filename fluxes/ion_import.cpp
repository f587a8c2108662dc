// SPDX-License-Identifier: Apache-2.0
#include "fluxes/ion_import.hpp"

#include <cmath>

namespace rille::fluxes {
namespace {

constexpr double pi = 3.14159265358979323846;
constexpr double degree = pi / 180;

double bin_measure(IonTableQuantity quantity, double energy_width, double from_deg, double to_deg) {
    switch (quantity) {
    case IonTableQuantity::per_ev_per_sr:
        return energy_width * 2 * pi * (std::cos(from_deg * degree) - std::cos(to_deg * degree));
    case IonTableQuantity::per_ev_per_deg: return energy_width * (to_deg - from_deg);
    case IonTableQuantity::per_bin: break;
    }
    return 1.0;
}

} // namespace

IonImport import_ions(const std::vector<double>& energy_edges_ev,
                      const std::vector<double>& angle_edges_deg,
                      std::vector<std::vector<double>> cell, IonTableQuantity quantity) {
    double sum = 0, last_energy = 0, last_angle = 0;
    for (std::size_t e = 0; e < cell.size() && e + 1 < energy_edges_ev.size(); ++e)
        for (std::size_t a = 0; a < cell[e].size() && a + 1 < angle_edges_deg.size(); ++a) {
            double& weight = cell[e][a];
            weight *= bin_measure(quantity, energy_edges_ev[e + 1] - energy_edges_ev[e],
                                  angle_edges_deg[a], angle_edges_deg[a + 1]);
            sum += weight;
            if (e + 2 == energy_edges_ev.size()) last_energy += weight;
            if (a + 2 == angle_edges_deg.size()) last_angle += weight;
        }
    // The distribution's own checks come first: `sum` means nothing before them.
    IonDistribution distribution =
        IonDistribution::histogram(energy_edges_ev, angle_edges_deg, std::move(cell));
    const double beyond = 1 - distribution.share_within_deg(60);
    return {std::move(distribution), 1 / sum, last_energy / sum, last_angle / sum,
            beyond > 1e-12 ? beyond : 0.0};
}

} // namespace rille::fluxes
