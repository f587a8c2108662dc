// SPDX-License-Identifier: Apache-2.0
#include "fluxes/cross_sections.hpp"
#include "fluxes/sampling.hpp"
#include "fluxes/sheath_trajectories.hpp"
#include "tests/support/sheath_cases.hpp"
#include "tests/support/statistics.hpp"

#include <catch2/catch.hpp>

#include <array>
#include <cmath>
#include <vector>

using namespace rille::fluxes;
using namespace rille::tests;

namespace {

using Vector = std::array<double, 3>; // z towards the wafer

/// Independent numbers in (0, 1].
class Dice {
public:
    explicit Dice(std::uint64_t seed) : seed_(seed) {}
    double operator()() { return 1 - unit_interval(stream_key(seed_, count_++)); }
    double normal() {
        return std::sqrt(-2 * std::log((*this)())) * std::cos(2 * sheath_pi * (*this)());
    }

private:
    std::uint64_t seed_, count_ = 0;
};

double squared(const Vector& v) {
    return v[0] * v[0] + v[1] * v[1] + v[2] * v[2];
}

/// One collision with a gas of the ion's mass, even in the frame of the centre of mass.
Vector bounced(const Vector& v, const Vector& gas, Dice& dice) {
    const double cosine = 2 * dice() - 1, turn = 2 * sheath_pi * dice();
    const double sine = std::sqrt(1 - cosine * cosine);
    const Vector way = {sine * std::cos(turn), sine * std::sin(turn), cosine};
    const Vector relative = {v[0] - gas[0], v[1] - gas[1], v[2] - gas[2]};
    Vector after;
    for (int k = 0; k < 3; ++k)
        after[k] = 0.5 * (v[k] + gas[k] + std::sqrt(squared(relative)) * way[k]);
    return after;
}

Arrival arrival(const Vector& v, double v1) {
    return {squared(v) / (v1 * v1), std::hypot(v[0], v[1]) / v[2], 0};
}

/// Argon in argon through a Child sheath of fixed width, step by step: leapfrog steps of a
/// two-hundredth of the period and of 0.005 of the fall, in each a chance 1 - exp(-n sigma v dt).
Arrivals by_hand(const Sheath& sheath, double mtorr, double gas_k, int ions) {
    const PhelpsArgon law;
    const double s = sheath.thickness_nm, period = sheath.voltage.period_s;
    const double v1 = speed_of(1, 39.948); // of 1 eV
    const double thermal = v1 * std::sqrt(0.5 * 8.617333262e-5 * gas_k);
    const double h = std::min(period / 200, 0.005 * s / (v1 * std::sqrt(sheath.voltage.highest())));
    Arrivals result;
    for (int i = 0; i < ions; ++i) {
        Dice dice(stream_key(77, i));
        double t = period * dice(), z = 0;
        Vector v = {0, 0, v1 * std::sqrt(entry_energy_ev(sheath))};
        while (z < s) {
            v[2] += h * 0.5 * v1 * v1 * sheath.voltage.at(t + 0.5 * h) * (4 / 3.) / s *
                    std::cbrt(std::max(z, 0.0) / s);
            z += h * v[2];
            t += h;
            if (z < 0) {
                z = -z;
                v[2] = -v[2];
            }
            const double energy = squared(v) / (v1 * v1);
            const double backward = law.backward_nm2(energy), even = law.isotropic_nm2(energy);
            const double path = gas_density(mtorr) * h * std::sqrt(squared(v));
            if (dice() > -std::expm1(-path * (backward + even))) continue;
            const Vector gas = {thermal * dice.normal(), thermal * dice.normal(),
                                thermal * dice.normal()};
            if (dice() * (backward + even) > backward) {
                v = bounced(v, gas, dice);
                continue;
            }
            if (v[2] > 0 && z < s) result.fast_neutrals.push_back(arrival(v, v1));
            v = gas;
            result.exchanges_per_ion += 1.0 / ions;
        }
        result.ions.push_back(arrival(v, v1));
    }
    return result;
}

/// Shares below some energies and within some angles.
std::vector<double> shares(const std::vector<Arrival>& arrivals, double mean_v) {
    std::vector<double> share(8, 0.0);
    const std::array<double, 4> energy = {0.1, 0.3, 0.7, 1.1}, angle = {0.5, 2, 10, 40};
    for (const auto& a : arrivals)
        for (std::size_t i = 0; i < 4; ++i) {
            share[i] += a.energy_ev < energy[i] * mean_v;
            share[4 + i] += a.tangent < std::tan(angle[i] * sheath_pi / 180);
        }
    for (double& s : share)
        s /= double(arrivals.size());
    return share;
}

} // namespace

TEST_CASE("collisions in a swinging sheath, against plain small steps", "[sheath]") {
    // Oracle: shares of the ions and of the fast neutrals below four energies and within four
    // angles, number of exchanges. Source: an independent Monte Carlo of plain small steps with
    // Phelps' closed forms. Tolerance: 4.5 binomial standard errors of the plain one's 6000 ions;
    // a pressure 10 % off must fail.
    Sheath sheath = swinging_sheath(4 / 3., 0.9, 5, 39.948);
    sheath.thickness_nm = 4e6;
    sheath.voltage.period_s = 1 / 2e6;
    const int ions = 6000;
    const Arrivals plain = by_hand(sheath, 30, 600, ions);
    const auto worst_pull = [&](double mtorr) {
        SheathIon ion = argon_ion(0, 600);
        ion.collisions = argon_in_argon(gas_density(mtorr));
        const Arrivals ours = follow_ions(sheath, ion, {64000, 1});
        double worst = 0;
        const auto compare = [&](const std::vector<Arrival>& a, const std::vector<Arrival>& b) {
            const auto expected = shares(a, 200), found = shares(b, 200);
            for (std::size_t i = 0; i < expected.size(); ++i) {
                const double p = std::clamp(expected[i], 1e-3, 1 - 1e-3);
                const double error = std::sqrt(p * (1 - p) / double(b.size()));
                worst = std::max(worst, std::fabs(found[i] - expected[i]) / error);
            }
        };
        compare(ours.ions, plain.ions);
        compare(ours.fast_neutrals, plain.fast_neutrals);
        const double spread = std::sqrt(2 * ours.exchanges_per_ion / ions);
        return std::max(worst,
                        std::fabs(plain.exchanges_per_ion - ours.exchanges_per_ion) / spread);
    };
    CHECK(plain.exchanges_per_ion > 1);
    CHECK(worst_pull(30) < 4.5);
    CHECK(worst_pull(33) > 4.5);
}
