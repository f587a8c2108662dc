// SPDX-License-Identifier: Apache-2.0
#include "fluxes/mechanism.hpp"
#include "fluxes/surface_chemistry.hpp"
#include "geometry/check.hpp"

#include <catch2/catch.hpp>

#include <cmath>
#include <string>
#include <vector>

using namespace rille::fluxes;

namespace {

constexpr double per_cm2 = 1e-14; ///< cm^-2 s^-1 in nm^-2 s^-1
constexpr double per_cm3 = 1e-21; ///< cm^-3 in nm^-3
constexpr double nm_per_min = 60;

SurfaceResponse respond_to(const Mechanism& m, std::vector<double> tallies,
                           std::vector<double> neutrals, double temperature_k = 300) {
    return respond(m, 0, {tallies.data(), neutrals.data(), temperature_k});
}

/// One material whose tally 0 is the yield-weighted ion flux given directly.
Mechanism one_surface(double density, std::vector<std::string> coverages,
                      std::vector<SurfaceProcess> processes, int tallies = 4) {
    Mechanism m;
    m.ions = {"Ar+"};
    m.neutrals = {"A", "B"};
    m.tallies.resize(tallies);
    m.surfaces.push_back({"target", density, std::move(coverages), std::move(processes)});
    return m;
}

/// Ion-enhanced etching by one adsorbate: s = 0.3, four atoms a unit, silicon.
Mechanism langmuir(double sticking = 0.3, double atoms = 4) {
    return one_surface(4.99e22 * per_cm3, {"Cl"},
                       {Adsorption{0, 0, sticking, 1, {}}, IonEnhancedEtching{0, atoms, {0}}});
}

} // namespace

// Oracle: coverage, yield and rate against the ratio of neutrals to ions.
// Source: steady state of a Langmuir site balance, derived here; values computed.
// Tolerance: half of the last printed digit.
TEST_CASE("Langmuir sweep", "[mechanism]") {
    const double ratio[] = {1, 10, 30, 100, 300, 1000};
    const double theta[] = {.0244, .2000, .4286, .7143, .8824, .9615};
    const double yield[] = {.0732, .6000, 1.2857, 2.1429, 2.6471, 2.8846};
    const double rate[] = {8.8, 72.1, 154.6, 257.7, 318.3, 346.8};
    const YieldFunction law{SquareRootLaw{0.5, 16}, FlatAngle{}, 1};
    const double ions = 1e16 * per_cm2, y = law(100, 1);
    for (const bool right : {true, false}) {
        const Mechanism m = langmuir(right ? 0.3 : 0.306);
        int misses = 0;
        for (int i = 0; i < 6; ++i) {
            const SurfaceResponse r = respond_to(m, {ions * y}, {ratio[i] * ions, 0});
            const double found = r.rate * 4.99e22 * per_cm3 / ions;
            misses += std::fabs(r.coverage[0] - theta[i]) > 0.501e-4;
            misses += std::fabs(found - yield[i]) > 0.501e-4;
            misses += std::fabs(r.rate * nm_per_min - rate[i]) > 0.0501;
            if (right) {
                CHECK(r.rate == r.by_ion_enhanced);
                CHECK(r.grown_material == -1);
            }
        }
        CHECK((misses == 0) == right);
    }
}

// Oracle: R -> 0: Y = s R / c; R -> infinity: Y = Ymax; Y = Ymax / 2 at R = c Ymax / s; 1/Y is
// linear in 1/R with slope c / s and intercept 1 / Ymax.
// Source: derived here.
// Tolerance: round-off (1e-12), limits to the size of the first neglected term.
TEST_CASE("Limits of the Langmuir balance", "[mechanism]") {
    const Mechanism m = langmuir();
    const double ions = 100, top = 3;
    const auto yield = [&](double r) {
        return respond_to(m, {ions * top}, {r * ions, 0}).rate * 4.99e22 * per_cm3 / ions;
    };
    CHECK(yield(1e-9) == Approx(0.3e-9 / 4).epsilon(1e-9));
    CHECK(yield(1e12) == Approx(top).epsilon(1e-10));
    CHECK(yield(4 * top / 0.3) == Approx(top / 2).epsilon(1e-12));
    for (const double r : {0.1, 1.0, 7.0, 60.0, 900.0})
        CHECK(1 / yield(r) == Approx(1 / top + 4 / 0.3 / r).epsilon(1e-12));
    CHECK(yield(0) == 0.0);
}

// Oracle: what sticks leaves again: s G theta_0 = c Y G_i theta + thermal loss + chemical removal,
// for two adsorbates, molecules that fill two sites, and ions that bring an atom.
// Source: conservation of atoms in steady state.
// Tolerance: 1e-12 relative.
TEST_CASE("Adsorbed flux equals consumed flux", "[mechanism]") {
    const double density = 50;
    Mechanism m = one_surface(
        density, {"Cl", "O"},
        {Adsorption{0, 0, 0.2, 2, {}}, IonAdsorption{0, {1}}, IonEnhancedEtching{0, 3, {0}},
         Desorption{0, {40, 0.1, 300}}, Adsorption{1, 1, 0.5, 1, {}}, IonRemoval{1, {2}},
         NeutralRemoval{1, 0, {0.01, 0, 300}, 1}, ThermalEtching{0, {25, 0, 300}, 4}});
    for (const double a : {3.0, 400.0, 1e5})
        for (const double b : {0.0, 50.0, 3e4})
            for (const double ions : {0.0, 1e-3, 100.0}) {
                const std::vector<double> t{2.5 * ions, ions, 0.8 * ions, 0};
                const SurfaceResponse r = respond_to(m, t, {a, b}, 330);
                const double bare = 1 - r.coverage[0] - r.coverage[1];
                const double leave = Arrhenius{40, 0.1, 300}.at(330);
                const double in0 = (2 * 0.2 * a + ions) * bare, in1 = 0.5 * b * bare;
                const double out0 = (3 * t[0] + leave + 25) * r.coverage[0];
                const double out1 = (t[2] + 0.01 * a) * r.coverage[1];
                const double margin = 1e-12 * (a + b + ions); // bare is a difference here
                CHECK(in0 == Approx(out0).epsilon(1e-12).margin(margin));
                CHECK(in1 == Approx(out1).epsilon(1e-12).margin(margin));
                CHECK(in0 != Approx(1.02 * out0).epsilon(1e-12).margin(margin));
                // The sticking that transport sees is that of the impinging neutral.
                const double kept = 0.2 * bare + 0.01 * r.coverage[1];
                CHECK(r.sticking[0] == Approx(kept).epsilon(1e-12).margin(1e-15));
                CHECK(r.sticking[1] == Approx(0.5 * bare).epsilon(1e-12).margin(1e-15));
                CHECK(r.rate == Approx((t[0] + 25.0 / 4) * r.coverage[0] / density).epsilon(1e-12));
            }
}

// Oracle: coverages, rate and its three parts for F and O competing on Si, with and without ions.
// Source: model of Belen, Gomperts, Cooperberg, Aydil, JVST A 23, 99 (2005) [from memory];
// illustrative parameters; values computed.
// Tolerance: half of the last printed digit (at most 4.1e-5 relative).
TEST_CASE("SF6/O2 on silicon", "[mechanism]") {
    const auto build = [](double fault) {
        return one_surface(5.02e22 * per_cm3, {"F", "O"},
                           {Adsorption{0, 0, 0.6, 1, {}},
                            ThermalEtching{0, {5e16 * per_cm2 * fault, 0, 300}, 4},
                            IonEnhancedEtching{0, 2, {0}}, Adsorption{1, 1, 0.9, 1, {}},
                            Desorption{1, {2e13 * per_cm2, 0, 300}}, IonRemoval{1, {1}},
                            PhysicalSputtering{{SurfacePart::Kind::whole, -1}, {2}}});
    };
    struct Row {
        double oxygen, ions, theta_f, theta_o, rate, chemical, enhanced, sputter;
    };
    const Row rows[] = {{0, 1e16, .831025, 0, 490.516, 124.16, 357.57, 8.7859},
                        {0, 0, .923077, 0, 137.91, 137.91, 0, 0},
                        {1e17, 1e16, .551594, .336248, 328.535, 82.409, 237.34, 8.7859},
                        {1e17, 1e15, .25404, .721742, 49.7635, 37.954, 10.931, .87859},
                        {1e17, 0, .00265899, .997119, .397259, .39726, 0, 0}};
    const double enhanced = 0.6 * (std::sqrt(100.0) - 4), remove = 0.5 * (std::sqrt(100.0) - 4);
    const double sputter = 0.02 * (std::sqrt(100.0) - std::sqrt(40.0));
    for (const bool right : {true, false}) {
        const Mechanism m = build(right ? 1.0 : 1.02);
        int misses = 0;
        for (const Row& row : rows) {
            const double g = row.ions * per_cm2;
            const SurfaceResponse r = respond_to(m, {enhanced * g, remove * g, sputter * g},
                                                 {1e18 * per_cm2, row.oxygen * per_cm2});
            const auto off = [](double found, double printed) {
                return std::fabs(found - printed) > 4.1e-5 * std::fabs(printed) + 1e-9;
            };
            misses += off(r.coverage[0], row.theta_f) + off(r.coverage[1], row.theta_o) +
                      off(r.rate * nm_per_min, row.rate) +
                      off(r.by_spontaneous * nm_per_min, row.chemical) +
                      off(r.by_ion_enhanced * nm_per_min, row.enhanced) +
                      off(r.by_sputtering * nm_per_min, row.sputter);
        }
        CHECK((misses == 0) == right);
    }
    const Mechanism m = build(1);
    const auto speed = [&](double oxygen, double g) {
        return respond_to(m, {enhanced * g, remove * g, sputter * g}, {1e4, oxygen}).rate;
    };
    CHECK(speed(0, 100) / speed(0, 0) == Approx(3.557).epsilon(2e-4));
    CHECK(speed(1e3, 100) / speed(1e3, 0) == Approx(827).epsilon(1e-3));
}

// Oracle: without any loss the adsorbate covers everything; two of them share the sites by their
// gains, the state that a bare surface reaches; the limit of a vanishing loss is continuous.
// Source: d theta_j / dt = gain_j theta_0 integrated from a bare surface, derived here.
// Tolerance: round-off.
TEST_CASE("Adsorbates that nothing removes", "[mechanism]") {
    const Mechanism one = langmuir();
    for (const double dark : {0.0, 1e-300, 1e-30, 1e-20}) {
        const SurfaceResponse r = respond_to(one, {dark}, {1000, 0});
        CHECK(r.coverage[0] == Approx(1).epsilon(1e-14));
        CHECK(r.sticking[0] <= 1e-14);
        CHECK(std::isfinite(r.rate));
    }
    const Mechanism two = one_surface(50, {"F", "O"},
                                      {Adsorption{0, 0, 0.6, 1, {}}, IonEnhancedEtching{0, 2, {0}},
                                       Adsorption{1, 1, 0.9, 1, {}}, IonRemoval{1, {1}}});
    const SurfaceResponse both = respond_to(two, {0, 0}, {1000, 200});
    CHECK(both.coverage[0] == Approx(600.0 / 780).epsilon(1e-14));
    CHECK(both.coverage[1] == Approx(180.0 / 780).epsilon(1e-14));
    CHECK(both.sticking[0] == 0.0);
    const SurfaceResponse first = respond_to(two, {10, 0}, {1000, 200});
    CHECK(first.coverage[0] == 0.0);
    CHECK(first.coverage[1] == 1.0);
    const SurfaceResponse nothing = respond_to(two, {0, 0}, {0, 0});
    CHECK(nothing.coverage[0] == 0.0);
    CHECK(nothing.sticking[0] == Approx(0.6));
    CHECK(nothing.rate == 0.0);
}

namespace {

/// Etchant E and polymer P on oxide: material 0 the oxide, 1 the polymer itself.
Mechanism fluorocarbon() {
    Mechanism m = one_surface(2.205e22 * per_cm3, {"E", "P"},
                              {Adsorption{0, 0, 0.3, 1, {}}, IonEnhancedEtching{0, 2, {0}},
                               Adsorption{1, 1, 0.2, 1, {}}, IonRemoval{1, {1}},
                               Deposition{1, 1, 0.05, 2.4e22 * per_cm3, 1, {}}});
    m.surfaces.push_back(
        {"polymer",
         2.4e22 * per_cm3,
         {},
         {PhysicalSputtering{{}, {1}}, Deposition{1, -1, 0.05, 2.4e22 * per_cm3, 1, {}}}});
    return m;
}

SurfaceResponse fluorocarbon_at(double ions_cm2, int material = 0) {
    static const Mechanism m = fluorocarbon();
    const double g = ions_cm2 * per_cm2;
    const double tallies[] = {0.8 * g, 0.5 * g}, neutrals[] = {1e17 * per_cm2, 2e16 * per_cm2};
    return respond(m, material, {tallies, neutrals, 300});
}

} // namespace

// Oracle: coverages and rates of the competing model, etching above and growth below the crossover
// at G_i = sPP G_P / YP = 2e15 cm^-2 s^-1.
// Source: reduction of Gogolides et al., J. Appl. Phys. 88, 5570 (2000) [from memory], derived
// here; illustrative parameters; values computed.
// Tolerance: half of the last printed digit.
TEST_CASE("Fluorocarbon on oxide: etching against deposition", "[mechanism]") {
    const double ions[] = {1e16, 5e15, 3e15};
    const double theta_e[] = {.48387, .50562, .40984}, theta_p[] = {.25806, .35955, .52459};
    const double rate[] = {105.33, 55.03, 26.76};
    for (int i = 0; i < 3; ++i) {
        const SurfaceResponse r = fluorocarbon_at(ions[i]);
        CHECK(std::fabs(r.coverage[0] - theta_e[i]) < 0.501e-5);
        CHECK(std::fabs(r.coverage[1] - theta_p[i]) < 0.501e-5);
        CHECK(std::fabs(r.rate * nm_per_min - rate[i]) < 0.00501);
        CHECK(r.grown_material == -1);
    }
    CHECK(std::fabs(fluorocarbon_at(1.02e16).rate * nm_per_min - rate[0]) > 0.5);
    CHECK(std::fabs(fluorocarbon_at(2e15).rate) * nm_per_min < 1e-9);
    const SurfaceResponse grown = fluorocarbon_at(1e14);
    CHECK(std::fabs(grown.rate * nm_per_min + 23.75) < 0.00501);
    CHECK(grown.grown_material == 1);
    CHECK(grown.coverage[1] == 1.0);
    CHECK(grown.rate == grown.by_deposition);
    // Once the polymer is the outermost material it answers the same.
    const SurfaceResponse film = fluorocarbon_at(1e14, 1);
    CHECK(film.rate == Approx(grown.rate).epsilon(1e-12));
    CHECK(film.grown_material == 1);
    CHECK(film.sticking[1] == Approx(grown.sticking[1]).epsilon(1e-12));
    CHECK(fluorocarbon_at(1e16, 1).rate > 0);
    CHECK(fluorocarbon_at(1e16, 1).grown_material == -1);
}

// Oracle: rate and sticking have no jump where etching turns into growth.
// Source: limit of the site balance for a vanishing net loss, derived here.
// Tolerance: change over a relative step d of the ion flux below 200 d nm/min (the slopes add up to
// 127) and 200 d of a sticking probability.
TEST_CASE("No jump at the crossover", "[mechanism]") {
    for (const double d : {1e-3, 1e-5, 1e-7, 1e-9, 1e-12}) {
        const SurfaceResponse above = fluorocarbon_at(2e15 * (1 + d));
        const SurfaceResponse below = fluorocarbon_at(2e15 * (1 - d));
        CHECK(above.rate > 0);
        CHECK(below.rate < 0);
        CHECK((above.rate - below.rate) * nm_per_min < 200 * d);
        for (int k = 0; k < 2; ++k)
            CHECK(std::fabs(above.sticking[k] - below.sticking[k]) < 200 * d);
    }
    // A jump of 1 nm/min would be seen at every d below 5e-3.
    CHECK((fluorocarbon_at(2.2e15).rate - fluorocarbon_at(1.8e15).rate) * nm_per_min > 1);
}

// Oracle: atoms of the film's species: what sticks is what ions remove plus what grows.
// Source: conservation.
// Tolerance: 1e-12 relative.
TEST_CASE("Polymer is conserved on both branches", "[mechanism]") {
    for (const double ions : {0.0, 1e14, 1.9e15, 2.1e15, 1e16}) {
        const SurfaceResponse r = fluorocarbon_at(ions);
        const double arrive = 2e16 * per_cm2, g = ions * per_cm2;
        const double growth = std::fmax(-r.rate, 0.0) * 2.4e22 * per_cm3;
        CHECK(r.sticking[1] * arrive == Approx(0.5 * g * r.coverage[1] + growth).epsilon(1e-12));
    }
}

// Oracle: rates of F on Si and SiO2 against temperature, their ratio, and the probability per F.
// Source: Flamm, Donnelly, Mucha, J. Appl. Phys. 52, 3633 (1981) [abstract]; values computed. The
// prefactor of the probability follows from rate = eps G_F / (4 n), G_F = n_F vbar / 4.
// Tolerance: 2e-3 relative for rates (Si: density 4.994e22 against handbook digits), half of the
// last digit for ratio.
TEST_CASE("Spontaneous etching by F", "[mechanism]") {
    const double temperature[] = {250, 298.15, 323.15, 373.15, 473.15};
    const double silicon[] = {306.0, 750.8, 1082.1, 1955.2, 4477.4}; // angstrom/min, 1e15 cm^-3
    const double oxide[] = {5.03, 18.63, 31.68, 74.58, 245.2};
    const double ratio[] = {60.9, 40.3, 34.2, 26.2, 18.3};
    const double printed_flux[] = {1.320e19, 1.441e19, 1.500e19, 1.612e19, 1.815e19};
    // vbar/4 of F per sqrt(T) [nm/s]; angstrom/min -> nm/s is 1/600.
    const double speed =
        1e9 * 0.25 * std::sqrt(8 * 1.380649e-23 / (std::acos(-1.0) * 18.998 * 1.66053906660e-27));
    const auto prefactor = [&](double k, double n) { return 4 * n * k / 600 / (speed * per_cm3); };
    const double n_si = 49.94, n_ox = 22.05;
    const auto material = [](double n, double p, double ea) {
        return one_surface(n, {}, {SpontaneousEtching{0, {p, ea}, 4, {}}});
    };
    const Mechanism si = material(n_si, prefactor(2.91e-12, n_si), 0.108);
    const Mechanism ox = material(n_ox, prefactor(6.14e-13, n_ox), 0.163);
    for (int i = 0; i < 5; ++i) {
        const double t = temperature[i], flux = 1e15 * per_cm3 * speed * std::sqrt(t);
        CHECK(flux / per_cm2 == Approx(printed_flux[i]).epsilon(5e-4));
        const double v_si = respond_to(si, {}, {flux, 0}, t).rate * 600;
        const double v_ox = respond_to(ox, {}, {flux, 0}, t).rate * 600;
        CHECK(v_si == Approx(silicon[i]).epsilon(2e-4));
        CHECK(v_ox == Approx(oxide[i]).epsilon(1e-3));
        CHECK(v_si != Approx(1.02 * silicon[i]).epsilon(2e-4));
        CHECK(std::fabs(v_si / v_ox - ratio[i]) < 0.06);
    }
    CHECK(respond_to(si, {}, {1, 0}, 298.15).sticking[0] == Approx(0.00173).epsilon(3e-3));
    CHECK(respond_to(si, {}, {1, 0}, 298.15).sticking[0] == Approx(0.00168).epsilon(0.035));
}

// Oracle: 113.75 nm/min for ions and O on resist, isotropic part 1.25 nm/min.
// Source: carbon balance with illustrative yields, computed.
// Tolerance: half of the last printed digit.
TEST_CASE("O2 on resist", "[mechanism]") {
    const Mechanism m = one_surface(4.8e22 * per_cm3, {},
                                    {PhysicalSputtering{{}, {0}}, PhysicalSputtering{{}, {1}},
                                     SpontaneousEtching{0, {1e-4, 0}, 1, {}}});
    const SurfaceResponse r = respond_to(m, {10, 80}, {1e4, 0});
    CHECK(std::fabs(r.rate * nm_per_min - 113.75) < 0.00501);
    CHECK(std::fabs(r.by_spontaneous * nm_per_min - 1.25) < 0.00501);
}

// Oracle: bare, whole and covered shares of sputtering; recombination and ion-assisted sticking.
// Source: definitions in the header.
// Tolerance: round-off.
TEST_CASE("Parts of the surface, recombination and assisted sticking", "[mechanism]") {
    const auto surface = [](SurfacePart part) {
        return one_surface(50, {"A"},
                           {Adsorption{0, 0, 0.2, 1, {0.01, {2}}}, Desorption{0, {60, 0, 300}},
                            PhysicalSputtering{part, {0}}, Recombination{0, {0.1, 0, 300}, part}});
    };
    using Kind = SurfacePart::Kind;
    for (const double assist : {0.0, 100.0, 1e6}) {
        const double s = std::fmin(0.2 * (1 + 0.01 * assist), 1.0);
        const double a = s * 300 / 60, bare = 1 / (1 + a);
        const std::vector<double> tallies{10, 0, assist, 0};
        const std::pair<SurfacePart, double> parts[] = {
            {{Kind::whole, -1}, 1.0}, {{Kind::bare, -1}, bare}, {{Kind::covered, 0}, a * bare}};
        for (const auto& [part, share] : parts) {
            const SurfaceResponse r = respond_to(surface(part), tallies, {300, 0});
            CHECK(r.rate == Approx(10 * share / 50).epsilon(1e-13));
            CHECK(r.sticking[0] == Approx(s * bare + 0.1 * share).epsilon(1e-13));
            CHECK(r.sticking[1] == 0.0);
        }
    }
    CHECK_THROWS_AS(respond(langmuir(), 1, {}), rille::InternalError);
    CHECK_THROWS_AS(respond(langmuir(), -1, {}), rille::InternalError);
}

// Oracle: an inert adsorbate multiplies the rate by 1 / (1 + aP / (1 + aE)).
// Source: site balance, derived here.
// Tolerance: round-off.
TEST_CASE("Blocking by an inert adsorbate", "[mechanism]") {
    const Mechanism m = one_surface(50, {"E", "P"},
                                    {Adsorption{0, 0, 0.3, 1, {}}, IonEnhancedEtching{0, 2, {0}},
                                     Adsorption{1, 1, 0.4, 1, {}}, IonRemoval{1, {1}}});
    const double free = respond_to(m, {80, 30}, {500, 0}).rate;
    const double blocked = respond_to(m, {80, 30}, {500, 70}).rate;
    const double a_e = 0.3 * 500 / 160, a_p = 0.4 * 70 / 30;
    CHECK(blocked / free == Approx(1 / (1 + a_p / (1 + a_e))).epsilon(1e-13));
}
