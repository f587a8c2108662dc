// SPDX-License-Identifier: Apache-2.0
#include "fluxes/sheath_trajectories.hpp"

#include <algorithm>
#include <cmath>
#include <numeric>
#include <stdexcept>

namespace rille::fluxes {
namespace {

constexpr double degree = 3.14159265358979323846 / 180;
/// Values in order, with the weight below each.
class Ordered {
public:
    Ordered(const std::vector<double>& value, const std::vector<double>& weight) {
        std::vector<std::size_t> order(value.size());
        std::iota(order.begin(), order.end(), 0);
        std::stable_sort(order.begin(), order.end(),
                         [&](std::size_t a, std::size_t b) { return value[a] < value[b]; });
        below_.push_back(0);
        for (const std::size_t i : order) {
            value_.push_back(value[i]);
            below_.push_back(below_.back() + (weight.empty() ? 1.0 : weight[i]));
        }
    }
    double first() const { return value_.front(); }
    double last() const { return value_.back(); }
    double below(double value) const {
        return below_[std::lower_bound(value_.begin(), value_.end(), value) - value_.begin()];
    }
    double all() const { return below_.back(); }

private:
    std::vector<double> value_, below_;
};

struct Bin {
    double low, high, weight;
    /// What a quantity in proportion to the value can be wrong by at most.
    double blur() const { return weight * (high - low); }
};

/// Edges of bins, `low` below all values and `high` above: the bin with the largest blur is halved
/// until there are enough, so peaks and tails share them by what they may cost. Bins narrower than
/// `narrowest` stay whole.
std::vector<double> graded_edges(const Ordered& values, double low, double high, int bins,
                                 double narrowest) {
    std::vector<Bin> parts = {{low, high, values.all()}};
    while (static_cast<int>(parts.size()) < bins) {
        Bin* worst = nullptr;
        for (Bin& bin : parts)
            if (bin.high - bin.low > narrowest && (!worst || bin.blur() > worst->blur()))
                worst = &bin;
        if (!worst || !(worst->weight > 0)) break;
        const double middle = 0.5 * (worst->low + worst->high);
        const double first = values.below(middle) - values.below(worst->low);
        const Bin upper = {middle, worst->high, worst->weight - first};
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

ArrivalBins bins_of(const std::vector<Arrival>& arrivals, const std::vector<double>& weight,
                    int energy_bins, int angle_bins) {
    if (arrivals.empty()) throw std::invalid_argument("a distribution needs at least one arrival");
    std::vector<double> energy, angle;
    for (const Arrival& a : arrivals) {
        if (!(std::isfinite(a.energy_ev) && a.energy_ev >= 0 && a.tangent >= 0))
            throw std::invalid_argument("arrivals need energies and angles that are not negative");
        energy.push_back(a.energy_ev);
        angle.push_back(std::atan(a.tangent) / degree);
    }
    const Ordered energies(energy, weight), angles(angle, weight);
    const double highest = std::max(energies.last(), 1e-9);
    const double sliver = 1e-6 * highest;
    const auto energy_edges = graded_edges(energies, std::max(0.0, energies.first() - 0.5 * sliver),
                                           highest + 0.5 * sliver, energy_bins, 4 * sliver);
    const double widest = std::clamp(angles.last() * (1 + 1e-9), 1e-4, 90.0);
    const auto angle_edges = graded_edges(angles, 0, widest, angle_bins, 1e-4);

    std::vector<std::vector<double>> sums(energy_edges.size() - 1,
                                          std::vector<double>(angle_edges.size() - 1, 0.0));
    for (std::size_t i = 0; i < arrivals.size(); ++i)
        sums[bin_of(energy_edges, energy[i])][bin_of(angle_edges, angle[i])] +=
            weight.empty() ? 1.0 : weight[i];
    return {energy_edges, angle_edges, std::move(sums)};
}

IonDistribution ArrivalBins::distribution() const {
    return IonDistribution::histogram(energy_edges_ev, angle_edges_deg, weight);
}

IonDistribution distribution_of(const std::vector<Arrival>& arrivals) {
    return bins_of(arrivals).distribution();
}

} // namespace rille::fluxes
