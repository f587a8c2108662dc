// SPDX-License-Identifier: Apache-2.0
#include "fluxes/direct_ions.hpp"

#include <algorithm>

namespace rille::fluxes {

double on_row(const std::vector<double>& angles, const float* row, double angle) {
    if (angle <= angles.front()) return row[0];
    if (angle >= angles.back()) return row[angles.size() - 1];
    const std::size_t k =
        std::upper_bound(angles.begin(), angles.end(), angle) - angles.begin() - 1;
    const double part = (angle - angles[k]) / (angles[k + 1] - angles[k]);
    return row[k] + part * (double(row[k + 1]) - row[k]);
}

DirectIons::DirectIons(const geometry::Domain& domain, const geometry::Surface& surface,
                       const geometry::RayCaster& caster, const std::vector<IonSource>& ions,
                       const std::vector<Tally>& tallies, const Options& options)
    : DirectIons(domain, surface, caster,
                 std::make_shared<IonTables>(domain.symmetry, ions, tallies), options) {}

DirectIons::DirectIons(const geometry::Domain& domain, const geometry::Surface& surface,
                       const geometry::RayCaster& caster, std::shared_ptr<const IonTables> tables,
                       const Options& options)
    : tables_(std::move(tables)), options_(options),
      gathered_(domain.extruded() ? gather_extruded(domain, surface, *tables_)
                                  : gather_full(domain, surface, caster, *tables_, options)) {}

DirectIons::~DirectIons() = default;

double DirectIons::tally(int m, int element) const {
    return gathered_.tally[m][element];
}

double DirectIons::tally_at(int m, int element, double angle) const {
    const TallyRow row = tally_row(m, element);
    return row.factor * on_row(tables_->angles(), row.value, angle);
}

DirectIons::TallyRow DirectIons::tally_row(int m, int element) const {
    return {gathered_.row[gathered_.row_of[m]].data() +
                std::size_t(element) * tables_->angles().size(),
            gathered_.factor[m]};
}

double DirectIons::tally_batch(int b, int m, int element) const {
    if (gathered_.batch.empty()) return tally(m, element);
    return gathered_.batch[m][std::size_t(element) * 8 + b];
}

double DirectIons::flux(int s, int element) const {
    return gathered_.flux[s][element];
}

void DirectIons::forget_rays() {
    gathered_.seen = {};
    gathered_.batch = {};
}

DirectIons::SkyRay DirectIons::ray(const geometry::Surface& surface, int ion, int element,
                                   int batch, int k) const {
    return sky_ray(surface, tables_->ions()[ion].distribution, options_, element,
                   gathered_.group_of[ion], batch, k);
}

const std::vector<double>& DirectIons::rate_angles() const {
    return tables_->angles();
}

} // namespace rille::fluxes
