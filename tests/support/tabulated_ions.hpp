// SPDX-License-Identifier: Apache-2.0
// Direct ions tally by tally, with the rows of the whole surface at hand.
#pragma once

#include "fluxes/direct_ions.hpp"

#include <algorithm>
#include <memory>
#include <vector>

namespace rille::tests {

class TabulatedIons {
public:
    using Options = fluxes::DirectIons::Options;
    TabulatedIons(const geometry::Domain& d, const geometry::Surface& s,
                  const geometry::RayCaster& caster,
                  std::shared_ptr<const fluxes::IonTables> tables, const Options& options)
        : tallies_(tables->tallies().size()), angles_(tables->angles()) {
        const int count = static_cast<int>(s.size());
        for (int e = 0; e <= count; ++e)
            reach_->first.push_back(e);
        reach_->material.assign(count, 0);
        fluxes::WantedSums wanted{{}, {{}}, reach_.get()};
        for (std::size_t m = 0; m < tallies_; ++m) {
            wanted.members.push_back({int(m)});
            wanted.of_material[0].push_back(int(m));
        }
        direct_ = std::make_unique<fluxes::DirectIons>(d, s, caster, std::move(tables),
                                                       std::move(wanted), options);
    }
    TabulatedIons(const geometry::Domain& d, const geometry::Surface& s,
                  const geometry::RayCaster& caster, const std::vector<fluxes::IonSource>& ions,
                  const std::vector<fluxes::Tally>& tallies, const Options& options)
        : TabulatedIons(d, s, caster,
                        std::make_shared<fluxes::IonTables>(d.symmetry, ions, tallies), options) {}

    operator const fluxes::DirectIons&() const { return *direct_; }
    double flux(int ion, int e) const { return direct_->flux(ion, e); }
    const std::vector<double>& rate_angles() const { return angles_; }
    /// Tally m at the element's own normal, and by one direction batch.
    double tally(int m, int e) const { return direct_->own(e).value[m]; }
    double tally_batch(int b, int m, int e) const {
        const auto own = direct_->own(e);
        return own.batch ? own.batch[m * 8 + b] : own.value[m];
    }
    /// With the normal turned to `angle`.
    double tally_at(int m, int e, double angle) const {
        if (rows_.empty()) tabulate();
        const double* row = rows_.data() + (e * tallies_ + m) * angles_.size();
        if (angle >= angles_.back()) return row[angles_.size() - 1];
        const auto above = std::upper_bound(angles_.begin(), angles_.end(), angle);
        const std::size_t k = std::max<std::ptrdiff_t>(above - angles_.begin(), 1) - 1;
        const double part = (angle - angles_[k]) / (angles_[k + 1] - angles_[k]);
        return row[k] + part * (row[k + 1] - row[k]);
    }

private:
    void tabulate() const {
        rows_.resize(reach_->material.size() * tallies_ * angles_.size());
        direct_->visit_rows([&](int e, const fluxes::DirectIons::Rows& rows) {
            for (std::size_t m = 0; m < tallies_; ++m)
                std::copy_n(rows.row(int(m)), angles_.size(),
                            rows_.begin() + (e * tallies_ + m) * angles_.size());
        });
    }

    std::size_t tallies_;
    std::vector<double> angles_;
    std::unique_ptr<fluxes::MaterialsInReach> reach_ = std::make_unique<fluxes::MaterialsInReach>();
    std::unique_ptr<fluxes::DirectIons> direct_;
    mutable std::vector<double> rows_; ///< [(e * tallies + m) * angles + k]
};

/// What reflected ions of one batch bring to an element by tally m, or sum m, altogether.
template <class Reflected>
double reflected_tally(const Reflected& reflected, int batch, int m, int element) {
    std::vector<double> value;
    reflected.at(element, value);
    double sum = 0;
    const std::size_t classes = value.size() / reflected.sums / 8;
    for (std::size_t k = 0; k < classes; ++k)
        sum += value[(batch * classes + k) * reflected.sums + m];
    return sum;
}

} // namespace rille::tests
