// SPDX-License-Identifier: Apache-2.0
#include "fluxes/sheath.hpp"

#include "fluxes/cross_sections.hpp"
#include "fluxes/plasma_laws.hpp"

#include <algorithm>
#include <cmath>
#include <cstdio>
#include <limits>
#include <stdexcept>

namespace rille::fluxes {
namespace {

constexpr double infinite = std::numeric_limits<double>::infinity();

void require(bool condition, const char* message) {
    if (!condition) throw std::invalid_argument(message);
}

/// Three digits, as a reader wants them.
std::string rounded(double value) {
    char text[32];
    std::snprintf(text, sizeof text, "%.3g", value);
    return text;
}

std::vector<SheathNote> notes_on(const SheathThickness& t, double te, double density,
                                 const Waveform& voltage, double gas_temperature_k) {
    using Kind = SheathNote::Kind;
    std::vector<SheathNote> notes;
    const double mean = voltage.mean();
    const double excess =
        child_wall_field(mean, te, density) / exact_wall_field(mean, te, density) - 1;
    if (excess > 0.08) notes.push_back({Kind::weak_field, excess});
    const double ratio = t.mean_free_path_nm / t.child_nm;
    if (ratio > 0.3 && ratio < 1) notes.push_back({Kind::between_regimes, ratio});
    if (t.law == SheathLaw::collisional) {
        const double gain = mean / t.nm * t.mean_free_path_nm;
        const double thermal = ev_per_kelvin * gas_temperature_k;
        if (gain < thermal) notes.push_back({Kind::slow_drift, gain / thermal});
    }
    if (!(voltage.lowest() > 0)) notes.push_back({Kind::not_positive, voltage.lowest()});
    return notes;
}

} // namespace

std::string in_words(const SheathNote& note) {
    switch (note.kind) {
    case SheathNote::Kind::weak_field:
        return "the sheath is weak against the electron temperature: Child's law overstates the "
               "field at the wafer by " +
               rounded(100 * note.value) + " %";
    case SheathNote::Kind::between_regimes:
        return "the mean free path is " + rounded(note.value) +
               " of the sheath: between the collisionless and the collisional law";
    case SheathNote::Kind::slow_drift:
        return "ions gain only " + rounded(note.value) +
               " of the gas temperature per mean free path: the collisional law fails";
    case SheathNote::Kind::not_positive:
        return "the sheath voltage falls to " + rounded(note.value) +
               " V: the plasma must stay above the wafer at all times";
    }
    return {};
}

SheathAndThickness make_sheath(double electron_temperature_ev, double edge_density,
                               const Waveform& voltage, double mean_free_path_nm,
                               double gas_temperature_k, SheathEdge edge) {
    const double mean = voltage.mean();
    require(std::isfinite(mean) && mean > 0, "the mean voltage across a sheath must be above zero");
    require(mean_free_path_nm > 0, "a mean free path must be above zero");
    require(gas_temperature_k > 0, "a gas temperature must be above zero");
    const double te = electron_temperature_ev;
    SheathThickness t;
    t.mean_free_path_nm = mean_free_path_nm;
    t.matrix_nm = matrix_thickness_nm(mean, te, edge_density);
    t.child_nm = child_thickness_nm(mean, te, edge_density);
    t.collisional_nm = std::isinf(mean_free_path_nm)
                           ? infinite
                           : collisional_thickness_nm(mean, te, edge_density, mean_free_path_nm);
    t.law = t.collisional_nm < t.child_nm ? SheathLaw::collisional : SheathLaw::child;
    t.nm = std::min(t.child_nm, t.collisional_nm);
    double power = t.law == SheathLaw::child ? 4 / 3. : 5 / 3.;
    if (edge == SheathEdge::moving) {
        t.nm = t.matrix_nm;
        power = 2;
    }
    t.debye_lengths = t.nm / debye_length_nm(te, edge_density);
    t.notes = notes_on(t, te, edge_density, voltage, gas_temperature_k);
    return {{te, edge_density, voltage, t.nm, power, edge}, t};
}

double mean_free_path_nm(const SheathIon& ion, double energy_ev) {
    double per_nm = 0;
    for (const CollisionProcess& process : ion.collisions)
        per_nm += process.gas_density * cross_section_nm2(process, energy_ev);
    return per_nm > 0 ? 1 / per_nm : infinite;
}

double transit_time_s(const Sheath& sheath, double mass_amu) {
    const double mean = sheath.voltage.mean();
    require(mean > 0, "the mean voltage across a sheath must be above zero");
    return 3 * sheath.thickness_nm / speed_of(mean, mass_amu);
}

double collisionality(const Sheath& sheath, const SheathIon& ion) {
    return sheath.thickness_nm / mean_free_path_nm(ion, sheath.voltage.mean());
}

} // namespace rille::fluxes
