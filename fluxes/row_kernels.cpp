// SPDX-License-Identifier: Apache-2.0
#include "fluxes/row_kernels.hpp"

#include "fluxes/exchange_operator.hpp"
#include "fluxes/sampling.hpp"
#include "geometry/check.hpp"

#include <algorithm>
#include <array>
#include <cmath>

namespace rille::fluxes {
namespace {

constexpr double half_pi = 1.57079632679489661923;
constexpr std::size_t most_angles = 256;              ///< IonTables has at most 240
constexpr std::uint64_t stream = 0x656e6572677900ULL; ///< keeps keys apart from other samplings

} // namespace

RowKernels::CosineTable::CosineTable(const AngleLaw& law) {
    for (int i = 0; i <= cells; ++i)
        value_.push_back(angle_factor(law, double(i) / cells));
    value_.push_back(value_.back());
}

RowKernels::EnergyTable::EnergyTable(const EnergyLaw& law, const IonDistribution& distribution)
    : law_(law) {
    low_ = high_ = distribution.sample({0.5, 0.5, 0.5, 0.5}).energy_ev;
    const ScrambledPoints points(stream);
    for (std::uint32_t i = 0; i < 256; ++i) {
        const double energy = distribution.sample(points.four(i)).energy_ev;
        low_ = std::min(low_, energy);
        high_ = std::max(high_, energy);
    }
    for (int i = 0; high_ > low_ && i <= cells; ++i)
        value_.push_back(energy_yield(law, low_ + (high_ - low_) * i / cells));
}

double RowKernels::EnergyTable::operator()(double energy) const {
    if (value_.empty() || energy < low_ || energy >= high_) return energy_yield(law_, energy);
    const double x = (energy - low_) / (high_ - low_) * cells;
    const int i = std::min(static_cast<int>(x), cells - 1);
    return value_[i] + (x - i) * (value_[i + 1] - value_[i]);
}

RowKernels::RowKernels(const IonTables& tables, const std::vector<std::vector<int>>& members)
    : angles_(tables.angles()) {
    RILLE_CHECK(angles_.size() <= most_angles, "too many angles in a table of ions");
    for (const double a : angles_) {
        cosine_.push_back(std::cos(a));
        sine_.push_back(std::sin(a));
    }
    std::vector<std::vector<double>> contents; // of the groups
    for (const IonSource& ion : tables.ions())
        join_group(ion.distribution, contents);
    term_.resize(groups_.size());
    for (std::size_t s = 0; s < members.size(); ++s)
        add_members(static_cast<int>(s), members[s], tables);
    for (std::vector<Term>& terms : term_)
        std::stable_sort(terms.begin(), terms.end(),
                         [](const Term& a, const Term& b) { return a.law < b.law; });
}

void RowKernels::join_group(const IonDistribution& distribution,
                            std::vector<std::vector<double>>& contents) {
    std::vector<double> content;
    distribution.append_content(content);
    const auto same = std::find(contents.begin(), contents.end(), content);
    group_of_.push_back(static_cast<int>(same - contents.begin()));
    if (same != contents.end()) return;
    contents.push_back(std::move(content));
    groups_.push_back(distribution);
}

int RowKernels::kernel_of(const Tally& tally) {
    const int group = group_of_[tally.ion];
    std::vector<double> content;
    append_content(tally.yield, content);
    const auto same = std::find_if(kernels_.begin(), kernels_.end(), [&](const Kernel& k) {
        return k.group == group && k.content == content;
    });
    if (same != kernels_.end()) return static_cast<int>(same - kernels_.begin());
    const CosineTable table(tally.yield.angle);
    const auto known = std::find(law_.begin(), law_.end(), table);
    const int law = static_cast<int>(known - law_.begin());
    if (known == law_.end()) law_.push_back(table);
    kernels_.push_back({group, std::move(content), law});
    energy_.emplace_back(tally.yield.energy, groups_[group]);
    return static_cast<int>(kernels_.size()) - 1;
}

/// Tallies that are multiples of one kernel are one term.
void RowKernels::add_members(int sum, const std::vector<int>& tallies, const IonTables& tables) {
    for (const int m : tallies) {
        const Tally& tally = tables.tallies()[m];
        const int kernel = kernel_of(tally);
        const double factor = tables.ions()[tally.ion].flux * tally.yield.scale;
        std::vector<Term>& terms = term_[kernels_[kernel].group];
        const auto known = std::find_if(terms.begin(), terms.end(), [&](const Term& t) {
            return t.place == sum && t.energy == kernel;
        });
        if (known == terms.end())
            terms.push_back({sum, kernels_[kernel].law, kernel, factor});
        else
            known->factor += factor;
    }
}

RowKernels::Selection RowKernels::select(const std::vector<int>& sums) const {
    Selection selection;
    selection.sums = sums;
    const int most = sums.empty() ? 0 : 1 + *std::max_element(sums.begin(), sums.end());
    selection.place.assign(most, -1);
    for (std::size_t i = 0; i < sums.size(); ++i)
        selection.place[sums[i]] = static_cast<int>(i);
    for (const std::vector<Term>& all : term_) {
        selection.terms.emplace_back();
        for (Term term : all) {
            term.place = term.place < most ? selection.place[term.place] : -1;
            if (term.place >= 0) selection.terms.back().push_back(term);
        }
    }
    return selection;
}

void RowKernels::add(const Selection& selection, int group, const Arrival& a, const Nodes& nodes,
                     std::vector<double>& rows) const {
    if (selection.terms[group].empty()) return;
    // Normals within a right angle of where the ion comes from; all of a few are sooner done.
    std::size_t from = nodes.from, count = nodes.size();
    if (count > 8) {
        const double centre = std::atan2(a.along, a.up);
        const auto begin = angles_.begin() + nodes.from, end = angles_.begin() + nodes.to;
        const auto first = std::lower_bound(begin, end, centre - half_pi);
        from = first - angles_.begin();
        count = std::upper_bound(first, end, centre + half_pi) - first;
    }
    std::array<double, most_angles> cosine, part, received;
    std::array<int, most_angles> cell;
    for (std::size_t k = 0; k < count; ++k) {
        const double c = cosine_[from + k] * a.up + sine_[from + k] * a.along;
        cosine[k] = c > 0 ? c : 0.0;
        const double x = (c < 1.0 ? cosine[k] : 1.0) * CosineTable::cells;
        cell[k] = static_cast<int>(x);
        part[k] = x - cell[k];
    }
    int law = -1;
    for (const Term& term : selection.terms[group]) {
        if (term.law != law) {
            law = term.law;
            for (std::size_t k = 0; k < count; ++k)
                received[k] = cosine[k] * law_[law].at(cell[k], part[k]);
        }
        const double strength = a.weight * term.factor * energy_[term.energy](a.energy);
        if (strength == 0) continue;
        double* row = rows.data() + std::size_t(term.place) * nodes.size() + from - nodes.from;
        for (std::size_t k = 0; k < count; ++k)
            row[k] += strength * received[k];
    }
}

void RowKernels::add_own(const Selection& selection, int group, const Arrival& a, double cosine,
                         double sine, std::vector<double>& batch) const {
    const double c = cosine * a.up + sine * a.along;
    if (!(c > 0)) return;
    for (const Term& term : selection.terms[group])
        batch[std::size_t(term.place) * batches + a.batch] += batches * a.weight * term.factor *
                                                              energy_[term.energy](a.energy) * c *
                                                              law_[term.law](c);
}

} // namespace rille::fluxes
