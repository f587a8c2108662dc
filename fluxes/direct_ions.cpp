// SPDX-License-Identifier: Apache-2.0
#include "fluxes/direct_ions.hpp"

#include "fluxes/ion_gather.hpp"

#include <algorithm>

namespace rille::fluxes {

AngleNode angle_node(const std::vector<double>& angles, double angle) {
    if (angle <= angles.front()) return {0, 0.0};
    const int last = static_cast<int>(angles.size()) - 2;
    if (angle >= angles.back()) return {last, 1.0};
    const auto above = std::upper_bound(angles.begin(), angles.end(), angle);
    const int k = static_cast<int>(above - angles.begin()) - 1;
    return {k, (angle - angles[k]) / (angles[k + 1] - angles[k])};
}

IonGather::IonGather(const geometry::Domain& domain, const geometry::Surface& surface,
                     const WantedSums& wanted)
    : average_(std::make_shared<ArcAverage>(arc_average(domain, surface))),
      normal_(averaged_normals(surface, *average_)) {
    first_.push_back(0);
    for (int e = 0; e < static_cast<int>(surface.size()); ++e)
        first_.push_back(first_.back() + static_cast<int>(wanted.of(e).size()));
    own_.resize(first_.back());
}

DirectIons::DirectIons(const geometry::Domain& domain, const geometry::Surface& surface,
                       const geometry::RayCaster& caster, std::shared_ptr<const IonTables> tables,
                       WantedSums wanted, const Options& options)
    : tables_(std::move(tables)), wanted_(std::move(wanted)),
      gather_(domain.extruded()
                  ? gather_extruded(domain, surface, *tables_, wanted_)
                  : gather_full(domain, surface, caster, *tables_, wanted_, options)) {}

DirectIons::~DirectIons() = default;

DirectIons::Own DirectIons::own(int element) const {
    return gather_->own(element);
}

void DirectIons::forget_own() {
    gather_->forget_own();
}

void DirectIons::visit_rows(const UseRows& use) const {
    gather_->visit_rows(use);
}

double DirectIons::flux(int s, int element) const {
    return gather_->flux(s, element);
}

const std::shared_ptr<const ArcAverage>& DirectIons::average() const {
    return gather_->average();
}

const std::vector<Vec3>& DirectIons::normal() const {
    return gather_->normal();
}

int DirectIons::groups() const {
    return gather_->groups();
}

int DirectIons::group_of(int ion) const {
    return gather_->group_of(ion);
}

int DirectIons::rays_per_batch() const {
    return gather_->rays_per_batch();
}

bool DirectIons::arrives(int group, int element, int batch, int k) const {
    return gather_->arrives(group, element, batch, k);
}

Launch DirectIons::place(const Launcher& of_element, int group, int element, int batch,
                         int k) const {
    return gather_->place(of_element, group, element, batch, k);
}

IonSample DirectIons::ion(int group, int element, int batch, int k) const {
    return gather_->ion(group, element, batch, k);
}

} // namespace rille::fluxes
