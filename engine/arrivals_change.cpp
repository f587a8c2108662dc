// SPDX-License-Identifier: Apache-2.0
#include "engine/arrivals_change.hpp"

#include <algorithm>
#include <cmath>

namespace rille::engine {
namespace {

using geometry::Vec3;

double rate_at(const geometry::NormalRates& rates, int row, double angle) {
    const std::size_t count = rates.angles.size();
    const auto above = std::upper_bound(rates.angles.begin(), rates.angles.end(), angle);
    const std::size_t k = std::clamp<std::size_t>(above - rates.angles.begin(), 1, count - 1) - 1;
    const double part =
        std::clamp((angle - rates.angles[k]) / (rates.angles[k + 1] - rates.angles[k]), 0.0, 1.0);
    const double* value = &rates.table[row * count + k];
    return value[0] + part * (value[1] - value[0]);
}

/// Variance of the mean over batches.
double variance(const std::vector<std::vector<double>>& batch, std::size_t e) {
    const double n = static_cast<double>(batch.size());
    double mean = 0, sum = 0;
    for (const auto& b : batch)
        mean += b[e] / n;
    for (const auto& b : batch)
        sum += (b[e] - mean) * (b[e] - mean);
    return sum / (n * (n - 1));
}

} // namespace

double arrivals_change(const geometry::Domain& domain, const geometry::Surface& surface,
                       const fluxes::SurfaceStep& now, const fluxes::SurfaceStep& later,
                       const std::vector<geometry::BetweenCentres>& feet) {
    if (later.rates.angles.size() != now.rates.angles.size()) return 0;
    struct Change {
        double size, removal;
    };
    std::vector<Change> changes;
    double removal = 0, squares = 0;
    for (std::size_t e = 0; e < surface.size(); ++e) {
        if (feet[e].element < 0) continue;
        const int row = now.rates.first_row[e], material = now.rates.material[row];
        const int other = later.rates.row(feet[e].element, material);
        if (other < 0) continue;
        const Vec3& n = surface.normal[e];
        const double angle =
            domain.planar_contour() ? std::atan2(n.x, n.z) : std::acos(std::clamp(n.z, -1.0, 1.0));
        const double before = rate_at(now.rates, row, angle);
        double after = rate_at(later.rates, other, angle);
        const int beside = feet[e].partner < 0 ? -1 : later.rates.row(feet[e].partner, material);
        if (beside >= 0)
            after =
                geometry::value_between(after, rate_at(later.rates, beside, angle), feet[e].share);
        const double noise =
            9 * (variance(now.rate_batch, e) + variance(later.rate_batch, feet[e].element));
        const double own = surface.area[e] * std::fabs(before);
        changes.push_back(
            {std::sqrt(std::max(0.0, (after - before) * (after - before) - noise)), own});
        removal += own;
        squares += own * std::fabs(before);
    }
    if (!(squares > 0)) return 0;
    std::sort(changes.begin(), changes.end(),
              [](const Change& a, const Change& b) { return a.size > b.size; });
    double above = 0;
    for (const Change& change : changes)
        if ((above += change.removal) > 0.5 * removal) return change.size * removal / squares;
    return 0;
}

} // namespace rille::engine
