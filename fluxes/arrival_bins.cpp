// SPDX-License-Identifier: Apache-2.0
#include "fluxes/sheath_trajectories.hpp"

#include <algorithm>
#include <cmath>
#include <stdexcept>

namespace rille::fluxes {
namespace {

constexpr double degree = 3.14159265358979323846 / 180;
constexpr int energy_bins = 96, angle_bins = 48;

struct Bin {
    double low, high;
    std::size_t count;
    /// What a quantity in proportion to the value can be wrong by at most.
    double blur() const { return double(count) * (high - low); }
};

/// Edges of bins over sorted values, `low` below all and `high` above: the bin with the largest
/// blur is halved until there are enough, so peaks and tails share them by what they may cost. Bins
/// narrower than `narrowest` stay whole.
std::vector<double> graded_edges(const std::vector<double>& sorted, double low, double high,
                                 int bins, double narrowest) {
    const auto count_below = [&](double value) {
        return std::size_t(std::lower_bound(sorted.begin(), sorted.end(), value) - sorted.begin());
    };
    std::vector<Bin> parts = {{low, high, sorted.size()}};
    while (static_cast<int>(parts.size()) < bins) {
        Bin* worst = nullptr;
        for (Bin& bin : parts)
            if (bin.high - bin.low > narrowest && (!worst || bin.blur() > worst->blur()))
                worst = &bin;
        if (!worst || worst->count == 0) break;
        const double middle = 0.5 * (worst->low + worst->high);
        const std::size_t first = count_below(middle) - count_below(worst->low);
        const Bin upper = {middle, worst->high, worst->count - first};
        *worst = {worst->low, middle, first};
        parts.push_back(upper);
    }
    std::vector<double> edges = {high};
    for (const Bin& bin : parts)
        edges.push_back(bin.low);
    std::sort(edges.begin(), edges.end());
    return edges;
}

std::size_t bin_of(const std::vector<double>& edges, double value) {
    const auto above = std::upper_bound(edges.begin(), edges.end(), value) - edges.begin();
    return std::size_t(std::clamp<std::ptrdiff_t>(above - 1, 0, std::ptrdiff_t(edges.size()) - 2));
}

} // namespace

ArrivalBins bins_of(const std::vector<Arrival>& arrivals) {
    if (arrivals.empty()) throw std::invalid_argument("a distribution needs at least one arrival");
    std::vector<double> energy, angle;
    for (const Arrival& a : arrivals) {
        if (!(std::isfinite(a.energy_ev) && a.energy_ev >= 0 && a.tangent >= 0))
            throw std::invalid_argument("arrivals need energies and angles that are not negative");
        energy.push_back(a.energy_ev);
        angle.push_back(std::atan(a.tangent) / degree);
    }
    std::vector<double> sorted_energy = energy, sorted_angle = angle;
    std::sort(sorted_energy.begin(), sorted_energy.end());
    std::sort(sorted_angle.begin(), sorted_angle.end());
    const double highest = std::max(sorted_energy.back(), 1e-9);
    const double sliver = 1e-6 * highest;
    const auto energy_edges =
        graded_edges(sorted_energy, std::max(0.0, sorted_energy.front() - 0.5 * sliver),
                     highest + 0.5 * sliver, energy_bins, 4 * sliver);
    const double widest = std::clamp(sorted_angle.back() * (1 + 1e-9), 1e-4, 90.0);
    const auto angle_edges = graded_edges(sorted_angle, 0, widest, angle_bins, 1e-4);

    std::vector<std::vector<double>> weight(energy_edges.size() - 1,
                                            std::vector<double>(angle_edges.size() - 1, 0.0));
    for (std::size_t i = 0; i < arrivals.size(); ++i)
        weight[bin_of(energy_edges, energy[i])][bin_of(angle_edges, angle[i])] += 1;
    return {energy_edges, angle_edges, std::move(weight)};
}

IonDistribution ArrivalBins::distribution() const {
    return IonDistribution::histogram(energy_edges_ev, angle_edges_deg, weight);
}

IonDistribution distribution_of(const std::vector<Arrival>& arrivals) {
    return bins_of(arrivals).distribution();
}

} // namespace rille::fluxes
