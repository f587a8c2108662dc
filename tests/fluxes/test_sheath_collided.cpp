// SPDX-License-Identifier: Apache-2.0
// What few collisions do in a thin sheath: the integration against closed laws and trajectories.
#include "fluxes/cross_sections.hpp"
#include "fluxes/sheath_arrival.hpp"
#include "fluxes/sheath_collided.hpp"
#include "tests/support/davis_vanderslice.hpp"
#include "tests/support/sheath_cases.hpp"

#include <catch2/catch.hpp>

#include <cmath>
#include <string>

using namespace rille::fluxes;
using namespace rille::tests;

namespace {

constexpr double drop_ev = 200;

/// Steady fall of 200 V through 1 mm from rest, no thermal motion.
Sheath steady_sheath(double power) {
    Sheath sheath;
    sheath.electron_temperature_ev = 1e-6;
    sheath.profile_power = power;
    sheath.thickness_nm = 1e6;
    sheath.voltage = Waveform::steady(drop_ev);
    return sheath;
}

/// Cold ion of 40 amu with one process of a constant cross section, `free_paths` in the sheath.
SheathIon one_process(CollisionProcess::Kind kind, double free_paths, double gas_amu = 40) {
    SheathIon ion = argon_ion(0, 0);
    ion.mass_amu = 40;
    ion.collisions = {constant_process(kind, "gas", gas_amu, free_paths / 1e6, 1)};
    return ion;
}

double per_ion(const std::vector<FewCollisions::Part>& parts) {
    double sum = 0;
    for (const auto& part : parts)
        sum += part.per_ion;
    return sum;
}
double energy_of(const std::vector<FewCollisions::Part>& parts) {
    double sum = 0;
    for (const auto& part : parts)
        sum += part.per_ion * part.particles.mean_energy_ev();
    return sum;
}

/// Share of draws below an energy.
double share_below(const IonDistribution& ions, double energy_ev) {
    int below = 0;
    for (int i = 0; i < 4096; ++i)
        below += ions.sample({0.5, 0, (i + 0.5) / 4096, 0.5}).energy_ev < energy_ev;
    return below / 4096.0;
}

/// Largest distance to Davis and Vanderslice: share that meets nothing, mean, shares below energies
/// of those that meet something.
double off_law(const FewCollisions& few, const DavisVanderslice& law) {
    double off = std::fabs(few.uncollided - law.uncollided());
    off = std::max(off, std::fabs(few.uncollided + energy_of(few.ions) / drop_ev - law.mean()));
    for (const double share : {0.1, 0.3, 0.5, 0.7, 0.9, 0.97})
        off = std::max(off, std::fabs(few.ions.front().per_ion *
                                          share_below(few.ions.front().particles, share * drop_ev) -
                                      law.below(share)));
    return off;
}

struct Case {
    std::string name;
    Sheath sheath;
    SheathIon ion;
};

/// Sheaths and gases in which the thickness is a tenth of the mean free path.
std::vector<Case> thin_cases() {
    using Kind = CollisionProcess::Kind;
    std::vector<Case> cases;
    const auto add = [&](std::string name, const Sheath& sheath, double mass,
                         std::vector<CollisionProcess> collisions) {
        SheathIon ion = argon_ion(0.05);
        ion.mass_amu = mass;
        ion.collisions = std::move(collisions);
        const double scale = 0.0999 / collisionality(sheath, ion);
        for (CollisionProcess& process : ion.collisions)
            process.gas_density *= scale;
        cases.push_back({std::move(name), sheath, ion});
    };
    for (const double omega_tau : {0.5, 5.0, 12.0})
        add("argon at omega tau " + std::to_string(omega_tau),
            swinging_sheath(4 / 3., 0.85, omega_tau, 39.948), 39.948, argon_in_argon(1e-7));
    const Sheath swinging = swinging_sheath(4 / 3., 0.6, 3, 69);
    add("heavy ion in light gas", swinging, 69,
        {constant_process(Kind::isotropic, "Ar", 39.948, 1e-7, 0.3)});
    add("light ion in heavy gas", swinging_sheath(4 / 3., 0.6, 3, 4), 4,
        {constant_process(Kind::isotropic, "Xe", 131.3, 1e-7, 0.3)});
    add("both kinds", swinging, 69,
        {constant_process(Kind::isotropic, "Ar", 39.948, 1e-7, 0.3),
         constant_process(Kind::charge_exchange, "CF3", 69, 1e-7, 0.3)});
    Sheath pulsed = swinging_sheath(4 / 3., 0.6, 3, 39.948);
    pulsed.voltage = Waveform::rectangular(2e6, 20, 520, 0.7);
    add("argon under pulses", pulsed, 39.948, argon_in_argon(1e-7));
    return cases;
}

} // namespace

TEST_CASE("charge exchange in a thin steady sheath", "[sheath][collided]") {
    // Oracle: uncollided share, mean and distribution of ions that only exchange their charge; the
    // energies of ions and fast neutrals add up to the drop. Source: Davis & Vanderslice, Phys.
    // Rev. 131 (1963) 219, from memory; derived here. Tolerance: 3e-4 of all ions, 2e-4 of the drop
    // (third collisions); 2 % more collisions or another potential must fail.
    for (const double power : {4 / 3., 5 / 3., 2.0}) {
        const double free_paths = 0.1;
        CAPTURE(power);
        const FewCollisions few = few_collisions(
            steady_sheath(power), one_process(CollisionProcess::Kind::charge_exchange, free_paths));
        CHECK(off_law(few, {free_paths, power}) < 3e-4);
        CHECK(off_law(few, {1.02 * free_paths, power}) > 3e-4);
        CHECK(off_law(few, {free_paths, power == 2 ? 5 / 3. : 2.0}) > 3e-4);
        CHECK(per_ion(few.ions) + few.uncollided == Approx(1).epsilon(1e-12));
        CHECK(per_ion(few.fast_neutrals) == Approx(free_paths).epsilon(2e-3));
        CHECK(few.uncollided + (energy_of(few.ions) + energy_of(few.fast_neutrals)) / drop_ev ==
              Approx(1).margin(2e-4));
        CHECK(few.uncollided_gain == Approx(1).epsilon(1e-12));
    }
}

TEST_CASE("elastic scattering in a thin steady sheath", "[sheath][collided]") {
    // Oracle: an ion keeps (1 + A^2) / (1 + A)^2 of its energy on average, A the gas over the ion;
    // for few collisions the mean falls by a / (m + 1) times the rest. With equal masses the share
    // scattered below an angle is sin^2, so that an ion is never thrown back. Source: elastic
    // collision isotropic in the frame of the centre of mass, derived here. Tolerance: 1 % of the
    // loss at a = 0.002.
    for (const double ratio : {0.25, 1.0, 3.0}) {
        const double free_paths = 0.002, power = 4 / 3.;
        CAPTURE(ratio);
        const FewCollisions few =
            few_collisions(steady_sheath(power),
                           one_process(CollisionProcess::Kind::isotropic, free_paths, 40 * ratio));
        const double kept = (1 + ratio * ratio) / ((1 + ratio) * (1 + ratio));
        const double lost = 1 - few.uncollided - energy_of(few.ions) / drop_ev;
        CHECK(lost == Approx((1 - kept) * free_paths / (power + 1)).epsilon(0.01));
        CHECK(few.fast_neutrals.empty());
    }
}

TEST_CASE("few collisions against trajectories at a tenth of the mean free path",
          "[sheath][collided]") {
    // Oracle: trajectories with all their collisions, ions and fast neutrals. Source: each other.
    // Tolerance: mean energy of the ions 1 %, median angle 5 %; number of fast neutrals and their
    // mean energy 1 % and 3 standard errors of the trajectories. Where charge exchange is left out
    // the mean must be off by more than 1 %.
    for (const Case& c : thin_cases()) {
        CAPTURE(c.name);
        CHECK(way_through(c.sheath, c.ion) != SheathWay::trajectories);
        const SheathArrival closed = arrive_in_closed_form(c.sheath, c.ion);
        const Arrivals followed = follow_ions(c.sheath, c.ion, {32768, 1});
        const double mean = energy_figures(followed.ions).mean;
        CHECK(closed.ions.front().mean_energy_ev() == Approx(mean).epsilon(0.01));
        CHECK(closed.ions.front().median_angle_deg() ==
              Approx(angle_quantile_deg(followed.ions, 0.5)).epsilon(0.05));
        if (followed.fast_neutrals.empty()) continue;
        const double count = double(followed.fast_neutrals.size());
        CHECK(closed.fast_neutrals_per_ion ==
              Approx(count / double(followed.ions.size())).epsilon(0.01 + 3 / std::sqrt(count)));
        const EnergyFigures fast = energy_figures(followed.fast_neutrals);
        CHECK(closed.fast_neutrals.front().mean_energy_ev() ==
              Approx(fast.mean).epsilon(0.01).margin(3 * fast.deviation / std::sqrt(count)));
        SheathIon free = c.ion;
        free.collisions.clear();
        const double without = arrive_in_closed_form(c.sheath, free).ions.front().mean_energy_ev();
        CHECK(std::fabs(without / mean - 1) > 0.01);
    }
}
