// SPDX-License-Identifier: Apache-2.0
#include "fluxes/yields.hpp"
#include "geometry/check.hpp"

#include <catch2/catch.hpp>

#include <cmath>
#include <string>
#include <vector>

using namespace rille::fluxes;

namespace {

struct Element {
    double z, m, us, q, w, s;
};
const Element carbon{6, 12.011, 7.37, 1.70, 1.84, 2.5};
const Element aluminium{13, 26.982, 3.39, 1.00, 2.17, 2.5};
const Element silicon{14, 28.086, 4.63, 0.66, 2.32, 2.5};
const Element copper{29, 63.546, 3.49, 1.00, 0.73, 2.5};
const Element tungsten{74, 183.84, 8.90, 0.72, 2.14, 2.8};

struct Projectile {
    double z, m;
};
const Projectile neon{10, 20.179}, argon{18, 39.948}, xenon{54, 131.29};

YamamuraTawaraLaw yamamura_tawara(const Projectile& p, const Element& e) {
    return {p.z, p.m, e.z, e.m, e.us, e.q, e.w, e.s};
}

CollisionPair pair(const Projectile& p, const Element& e) {
    return {p.z, p.m, e.z, e.m, e.us};
}

double angle_deg(const AngleLaw& law, double degrees) {
    return angle_factor(law, std::cos(degrees * std::acos(-1.0) / 180.0));
}

/// Values printed with so many decimals agree within half a digit of the last place.
bool agrees(double value, double printed, double last_digit) {
    return std::fabs(value - printed) <= 0.501 * last_digit;
}

struct SputterRow {
    Projectile projectile;
    Element target;
    double threshold;
    double yield[5]; ///< at 50, 100, 200, 500, 1000 eV
};
const std::vector<SputterRow> sputter_table{
    {argon, carbon, 69.46, {0, 0.0047, 0.0575, 0.2246, 0.4093}},
    {argon, aluminium, 23.60, {0.0384, 0.1771, 0.4265, 0.9112, 1.3689}},
    {argon, silicon, 31.99, {0.0063, 0.0585, 0.1718, 0.4102, 0.6436}},
    {argon, copper, 16.87, {0.1258, 0.3972, 0.8381, 1.6758, 2.4780}},
    {argon, tungsten, 33.97, {0.0030, 0.0456, 0.1610, 0.4447, 0.7598}},
    {neon, carbon, 52.78, {0, 0.0158, 0.0824, 0.2380, 0.3823}},
    {neon, aluminium, 18.22, {0.0678, 0.2205, 0.4558, 0.8601, 1.2007}},
    {neon, silicon, 24.24, {0.0174, 0.0815, 0.1926, 0.3950, 0.5709}},
    {neon, copper, 13.40, {0.1446, 0.3778, 0.7219, 1.3208, 1.8485}},
    {neon, tungsten, 40.58, {0.0004, 0.0209, 0.0886, 0.2616, 0.4499}},
    {xenon, carbon, 160.76, {0, 0, 0.0017, 0.0915, 0.2728}},
    {xenon, aluminium, 40.15, {0.0021, 0.0684, 0.2610, 0.7469, 1.3048}},
    {xenon, silicon, 53.42, {0, 0.0159, 0.0945, 0.3228, 0.5986}},
    {xenon, copper, 26.60, {0.0407, 0.2417, 0.6552, 1.5845, 2.6129}},
    {xenon, tungsten, 46.42, {0.0001, 0.0316, 0.1703, 0.5875, 1.1127}},
};
const double sputter_energies[5] = {50, 100, 200, 500, 1000};

/// Number of printed yields and thresholds that a law, changed by `change`, does not reproduce.
template <class Change>
int sputter_misses(Change change) {
    int misses = 0;
    for (const SputterRow& row : sputter_table) {
        YamamuraTawaraLaw law = yamamura_tawara(row.projectile, row.target);
        change(law);
        if (!agrees(yamamura_tawara_terms(law, 500).threshold_ev, row.threshold, 0.01)) ++misses;
        for (int i = 0; i < 5; ++i)
            if (!agrees(energy_yield(law, sputter_energies[i]), row.yield[i], 1e-4)) ++misses;
    }
    return misses;
}

} // namespace

// Oracle: printed thresholds and yields of 15 ion-target pairs at five energies.
// Source: Yamamura & Tawara, At. Data Nucl. Data Tables 62, 149 (1996), with the erratum; formula
// and elements read in teaching notes, the values computed independently from the formula.
// Tolerance: half of the last printed digit.
TEST_CASE("Yamamura-Tawara yields of fifteen pairs", "[yields]") {
    CHECK(sputter_misses([](YamamuraTawaraLaw&) {}) == 0);
    CHECK(sputter_misses([](YamamuraTawaraLaw& law) { law.q *= 1.02; }) > 30);
    CHECK(sputter_misses([](YamamuraTawaraLaw& law) { law.s += 0.3; }) > 30);
}

// Oracle: every intermediate quantity of Ar on Si at 500 eV.
// Source: as above, computed.
// Tolerance: 1e-4 relative (five printed digits).
TEST_CASE("Yamamura-Tawara intermediates of Ar on Si", "[yields]") {
    const auto law = yamamura_tawara(argon, silicon);
    const YamamuraTawaraTerms t = yamamura_tawara_terms(law, 500);
    CHECK(t.gamma == Approx(0.96960).epsilon(1e-4));
    CHECK(t.alpha == Approx(0.20825).epsilon(1e-4));
    CHECK(t.eps == Approx(7.4882e-3).epsilon(1e-4));
    CHECK(t.ke == Approx(0.12673).epsilon(1e-4));
    CHECK(t.sn == Approx(0.19366).epsilon(1e-4));
    CHECK(t.stopping_ev_a2 == Approx(682.34).epsilon(1e-4));
    CHECK(t.big_gamma == Approx(0.012416).epsilon(1e-4));
    CHECK(energy_yield(law, 500) == Approx(0.41022).epsilon(1e-4));
    CHECK(energy_yield(law, 510) != Approx(0.41022).epsilon(1e-3));
    CHECK(energy_yield(law, 31.9) == 0.0);
    CHECK(energy_yield(law, -5) == 0.0);
}

// Oracle: printed coefficients and yields of the Bohdansky form for Ar, q fitted at 500 eV.
// Source: Bohdansky, NIM B 2, 587 (1984) [from memory]; values computed.
// Tolerance: coefficients four digits; yields half of the last printed digit plus
// 1.3e-4 relative (q is printed with four digits).
TEST_CASE("Bohdansky yields of Ar", "[yields]") {
    struct Row {
        Element target;
        double etf, threshold, q, yield[4];
    };
    const Row rows[] = {{silicon, 6.681e4, 42.65, 3.874, {0.0591, 0.2163, 0.5060, 0.7477}},
                        {copper, 1.055e5, 23.19, 19.00, {0.6192, 1.3318, 2.4940, 3.4797}},
                        {tungsten, 2.467e5, 38.66, 6.665, {0.0723, 0.2398, 0.5610, 0.8552}},
                        {aluminium, 6.282e4, 31.73, 8.057, {0.2205, 0.5786, 1.1740, 1.6593}}};
    for (const Row& row : rows) {
        const BohdanskyLaw law = bohdansky_law(pair(argon, row.target), row.q);
        CHECK(law.etf_ev == Approx(row.etf).epsilon(1e-3));
        CHECK(agrees(law.threshold_ev, row.threshold, 0.01));
        const double energies[] = {100, 200, 500, 1000};
        for (int i = 0; i < 4; ++i) {
            INFO("target " << row.target.z << " at " << energies[i]);
            CHECK(std::fabs(energy_yield(law, energies[i]) - row.yield[i]) <=
                  0.5e-4 + 1.3e-4 * row.yield[i]);
        }
        CHECK(energy_yield(law, 500) != Approx(1.02 * row.yield[2]).epsilon(1e-3));
        CHECK(energy_yield(law, row.threshold - 0.1) == 0.0);
    }
    // A light ion takes the other branch of the threshold: Us / (gamma (1 - gamma)).
    const BohdanskyLaw light = bohdansky_law({1, 1.008, 74, 183.84, 8.9}, 1);
    const double gamma = 4 * 1.008 * 183.84 / std::pow(1.008 + 183.84, 2);
    CHECK(light.threshold_ev == Approx(8.9 / (gamma * (1 - gamma))).epsilon(1e-12));
}

const EcksteinLaw argon_tungsten{0.2113, 5.948, 2.386, 4.054e-6, 27.05};
const EcksteinLaw xenon_copper{0.2781, 24.46, 2.239, 1.391e-6, 23.63};
const EcksteinLaw aluminium_itself{0.6008, 3.918, 1.955, 2.895e-5, 16.1};

// Oracle: yields tabulated by an atomic-data base with the fit's coefficients.
// Source: Eckstein, Topics Appl. Phys. 110 (2007), coefficients and tables read in the data base.
// Tolerance: 0.1 % at the printed energies; half a digit of the last place where that is more, and
// the change of the yield over half a digit of the rounded energy.
TEST_CASE("Eckstein yields of the published tables", "[yields]") {
    struct Point {
        EcksteinLaw law;
        double energy, rounding_ev, yield;
    };
    const Point points[] = {
        {argon_tungsten, 103.4, 0.05, 0.0633},   {argon_tungsten, 202.3, 0.05, 0.2732},
        {argon_tungsten, 553.1, 0.05, 0.5930},   {argon_tungsten, 1082, 0.5, 0.8239},
        {xenon_copper, 109.5, 0.05, 0.1152},     {xenon_copper, 507.7, 0.05, 1.277},
        {xenon_copper, 1004, 0.5, 1.924},        {aluminium_itself, 114.4, 0.05, 0.2330},
        {aluminium_itself, 568.8, 0.05, 0.9011}, {aluminium_itself, 971, 0.5, 1.074}};
    for (const Point& p : points) {
        INFO(p.energy << " eV, yield " << p.yield);
        const double slope =
            energy_yield(p.law, p.energy + p.rounding_ev) - energy_yield(p.law, p.energy);
        CHECK(energy_yield(p.law, p.energy) == Approx(p.yield).epsilon(1e-3).margin(slope));
        CHECK(energy_yield(p.law, p.energy) != Approx(1.02 * p.yield).epsilon(1e-3).margin(slope));
    }
    const double energies[] = {100, 200, 500, 1000};
    const double printed[] = {0.0566, 0.2692, 0.5612, 0.7949};
    for (int i = 0; i < 4; ++i)
        CHECK(agrees(energy_yield(argon_tungsten, energies[i]), printed[i], 1e-4));
    CHECK(energy_yield(argon_tungsten, 27.0) == 0.0);
}

// Oracle: Y = A (sqrt E - sqrt Eth): 0.5 (10 - 4) = 3, and secants through measured points.
// Source: Steinbruchel, Appl. Phys. Lett. 55, 1960 (1989) [citation from memory]; computed.
// Tolerance: round-off; the secants to the printed digits (0.5 %).
TEST_CASE("Square-root law", "[yields]") {
    CHECK(energy_yield(SquareRootLaw{0.5, 16}, 100) == Approx(3.0).epsilon(1e-14));
    CHECK(energy_yield(SquareRootLaw{0.5, 16}, 16) == 0.0);
    CHECK(energy_yield(SquareRootLaw{0.5, 16}, 4) == 0.0);
    CHECK(energy_yield(SquareRootLaw{0.1159, 21.6}, 200) == Approx(1.1).epsilon(5e-3));
    CHECK(energy_yield(SquareRootLaw{0.1159, 21.6}, 600) == Approx(2.3).epsilon(5e-3));
    CHECK(energy_yield(ConstantLaw{0.8}, 1e-3) == 0.8);
}

// Oracle: a molecular ion of x atoms yields x times the yield of one atom at E / x.
// Source: Nakazaki et al., Jpn. J. Appl. Phys. 53, 056201 (2014) [abstract]; algebra derived here.
// Tolerance: round-off.
TEST_CASE("Ions that share their energy between atoms", "[yields]") {
    const EnergyLaw laws[] = {SquareRootLaw{0.5, 16}, BohdanskyLaw{3.874, 6.681e4, 42.65},
                              argon_tungsten, ConstantLaw{0.3}};
    for (const EnergyLaw& law : laws) {
        const YieldFunction one{law, PlateauCosine{45}, 0.7};
        for (const double atoms : {1.0, 2.0, 3.0})
            for (const double energy : {20.0, 50.0, 150.0, 600.0})
                CHECK(shared_by_atoms(one, atoms)(energy, 0.6) ==
                      Approx(atoms * one(energy / atoms, 0.6)).epsilon(1e-12));
    }
    const YieldFunction element{yamamura_tawara(argon, silicon), FlatAngle{}, 1};
    CHECK(shared_by_atoms(element, 1)(500, 1) == element(500, 1));
    CHECK_THROWS_AS(shared_by_atoms(element, 2), rille::InternalError);
    CHECK_THROWS_AS(shared_by_atoms(element, 0.5), rille::InternalError);
}

// Oracle: printed factors of the two plateau forms and of the generic peaked form.
// Source: forms from memory (flat to 45 or 60 deg: Chang & Sawin 1997) and Yamamura, Radiat. Eff.
// 80, 57 (1984); values computed.
// Tolerance: half of the last printed digit.
TEST_CASE("Angular factors", "[yields]") {
    const double angles[] = {60, 70, 80, 85};
    const double cosine[] = {0.7071, 0.4837, 0.2456, 0.1233};
    const double linear[] = {1, 0.6667, 0.3333, 0.1667};
    for (int i = 0; i < 4; ++i) {
        CHECK(agrees(angle_deg(PlateauCosine{45}, angles[i]), cosine[i], 1e-4));
        CHECK(agrees(angle_deg(PlateauLinear{60}, angles[i]), linear[i], 1e-4));
    }
    const double generic_angles[] = {30, 45, 60, 65, 75, 80, 85};
    const double generic[] = {1.1699, 1.4092, 1.7178, 1.7644, 1.3268, 0.5940, 0.0188};
    for (int i = 0; i < 7; ++i) {
        CHECK(agrees(angle_deg(YamamuraAngle{2, 65}, generic_angles[i]), generic[i], 1e-4));
        if (i != 3)
            CHECK_FALSE(
                agrees(angle_deg(YamamuraAngle{2.04, 65}, generic_angles[i]), generic[i], 1e-4));
    }
    for (const AngleLaw& law : {AngleLaw(PlateauCosine{45}), AngleLaw(PlateauLinear{60}),
                                AngleLaw(YamamuraAngle{2, 65}), AngleLaw(FlatAngle{})}) {
        CHECK(angle_deg(law, 0) == 1.0);
        CHECK(angle_factor(law, 0.0) == 0.0);
        CHECK(angle_factor(law, -0.1) == 0.0);
        CHECK(angle_factor(law, 1.0 + 1e-15) == 1.0);
    }
    CHECK(angle_factor(YamamuraAngle{2, 65}, 1e-9) == 0.0);
}

// Oracle: the peak lies at the optimum and is (cos opt)^-f exp(-f (1 - cos opt)).
// Source: derivative of the form, derived here.
// Tolerance: 1e-13 for the value; no neighbour 0.01 deg away is higher.
TEST_CASE("Peak of the peaked angular form", "[yields]") {
    for (const double f : {1.5, 2.0, 3.416, 5.49})
        for (const double optimum : {55.0, 65.0, 72.0}) {
            const YamamuraAngle law{f, optimum};
            const double c = std::cos(optimum * std::acos(-1.0) / 180.0);
            const double peak = std::pow(c, -f) * std::exp(-f * (1 - c));
            CHECK(angle_deg(law, optimum) == Approx(peak).epsilon(1e-13));
            CHECK(angle_deg(law, optimum - 0.01) < peak);
            CHECK(angle_deg(law, optimum + 0.01) < peak);
            CHECK(peak != Approx(angle_deg(law, optimum + 5)).epsilon(1e-3));
        }
}

// Oracle: printed f, optimum and factors of Ar on six targets.
// Source: Yamamura, Radiat. Eff. 80, 57 (1984), formula read in teaching notes; computed.
// Tolerance: half of the last printed digit, plus what half a digit of the rounded atomic spacing
// R0 changes: 5e-4 relative, 1.7e-3 at 80 deg.
TEST_CASE("Angular law of heavy ions", "[yields]") {
    struct Row {
        Element target;
        double spacing_a, energy, f, optimum, factor[3], peak, at80;
    };
    const Row rows[] = {{silicon, 2.716, 200, 5.325, 60.7, {1.437, 2.149, 2.951}, 2.954, 0.045},
                        {silicon, 2.716, 500, 3.416, 66.1, {1.320, 1.843, 2.679}, 2.877, 0.550},
                        {silicon, 2.716, 1000, 2.768, 69.6, {1.282, 1.749, 2.593}, 3.041, 1.283},
                        {copper, 2.275, 500, 2.732, 61.7, {1.212, 1.507, 1.819}, 1.826, 0.252},
                        {tungsten, 2.511, 500, 3.417, 62.8, {1.284, 1.710, 2.237}, 2.267, 0.233},
                        {aluminium, 2.552, 500, 3.093, 65.3, {1.277, 1.709, 2.339}, 2.450, 0.475},
                        {carbon, 2.065, 500, 5.490, 63.8, {1.514, 2.455, 3.976}, 4.141, 0.145}};
    const auto close = [](double value, double printed, double relative) {
        return std::fabs(value - printed) <= 0.5e-3 + relative * printed;
    };
    for (const Row& row : rows) {
        INFO("target " << row.target.z << " at " << row.energy);
        const double density = 1e3 / std::pow(row.spacing_a, 3);
        const YamamuraAngle law = yamamura_angle(pair(argon, row.target), density, row.energy);
        CHECK(agrees(law.f, row.f, 1e-3));
        CHECK(agrees(law.optimum_deg, row.optimum, 0.1));
        for (int i = 0; i < 3; ++i)
            CHECK(close(angle_deg(law, 30.0 + 15.0 * i), row.factor[i], 5e-4));
        CHECK(close(angle_deg(law, law.optimum_deg), row.peak, 5e-4));
        CHECK_FALSE(close(angle_deg(law, law.optimum_deg), 1.02 * row.peak, 5e-4));
        CHECK(close(angle_deg(law, 80), row.at80, 1.7e-3));
        CHECK(yamamura_angle(pair(argon, row.target), density, row.energy, 1.71).f > 1.02 * law.f);
    }
    CHECK(yamamura_angle(pair(argon, silicon), 50, 30).f == 15.0);
}
