// SPDX-License-Identifier: Apache-2.0
// What a rate is made of: ions by their path, neutrals, deposition; and how it answers to supplies.
#include "fluxes/causes.hpp"
#include "fluxes/surface_chemistry.hpp"
#include "fluxes/surface_step.hpp"
#include "tests/support/revolved_shapes.hpp"

#include <catch2/catch.hpp>

#include <cmath>
#include <numeric>

using namespace rille;
using namespace rille::fluxes;
using geometry::Domain;
using geometry::RayCaster;
using geometry::Surface;

namespace {

const IonReflection glancing{50, 1, 0.9, 2, 28, 5};

/// A feature of silicon under argon ions that are reflected, etched by chlorine (invented numbers):
/// a trench where nothing else is said.
struct Feature {
    Domain domain;
    Surface surface;
    Mechanism mechanism;
    Sources sources;
    MaterialsInReach reach;
    std::vector<IonReflection> reflection;
    Sampling sampling;

    explicit Feature(double spread_ev = 1,
                     geometry::Symmetry symmetry = geometry::Symmetry::extruded) {
        sampling.detailed = true;
        shape(symmetry);
        mechanism.ions = {"Ar+"};
        mechanism.neutrals = {"Cl", "CF2"};
        mechanism.tallies = {{0, {SquareRootLaw{0.5, 16}, FlatAngle{}, 1}},
                             {0, {SquareRootLaw{0.02, 20}, YamamuraAngle{2, 65}, 1}}};
        SurfaceChemistry silicon{"silicon", 50, {"Cl"}, {}};
        silicon.processes = {Adsorption{0, 0, 0.3, 1, {}}, IonEnhancedEtching{0, 4, {0}},
                             PhysicalSputtering{{SurfacePart::Kind::bare, -1}, {1}},
                             SpontaneousEtching{0, {0.01, 0, 300}, 4, {}},
                             Deposition{1, -1, 0.02, 40, 1, {}}};
        SurfaceChemistry polymer{"polymer", 40, {}, {}};
        polymer.processes = {PhysicalSputtering{{}, {0}}};
        mechanism.surfaces = {silicon, polymer};
        sources.ions = {{"Ar+", 40, 100, IonDistribution::thermal_fall(100, spread_ev, 0.05)}};
        sources.neutrals = {{"Cl", 1000, 300}, {"CF2", 100, 300}};
        reflection = {glancing, glancing};
        for (std::size_t e = 0; e <= surface.size(); ++e) {
            reach.first.push_back(int(e));
            if (e < surface.size()) reach.material.push_back(0);
        }
    }
    /// 20 wide, 60 deep.
    void shape(geometry::Symmetry symmetry) {
        domain.symmetry = symmetry;
        domain.cells_x = symmetry == geometry::Symmetry::revolved ? 20 : 40;
        if (symmetry == geometry::Symmetry::full) domain.cells_y = 40;
        if (symmetry == geometry::Symmetry::extruded)
            surface = tests::trench(domain, 20, 60, 1);
        else if (symmetry == geometry::Symmetry::revolved)
            surface = tests::round_hole(domain, 10, 60, 1);
        else
            surface = tests::revolved_hole(
                domain, {{10, 0}, {10, -20}, {10, -40}, {10, -60}, {0, -60}}, 24);
    }
    /// Only sputtering.
    void sputter_only() {
        mechanism.surfaces[0] = {"silicon", 50, {}, {PhysicalSputtering{{}, {1}}}};
        mechanism.neutrals.clear();
        sources.neutrals.clear();
    }
    SurfaceStep solve() const {
        const RayCaster caster(domain, surface, 2.0);
        return solve_surface(domain, surface, caster, reach, mechanism, reflection, sources,
                             sampling, nullptr);
    }
};

double sum_of(const CauseFields& fields, std::size_t e) {
    double sum = 0;
    for (const auto& field : fields)
        sum += field[e];
    return sum;
}

double largest_gap(const SurfaceStep& step) {
    double worst = 0;
    for (std::size_t e = 0; e < step.response.size(); ++e)
        worst = std::max(worst, std::fabs(sum_of(step.cause, e) - step.response[e].rate) /
                                    std::fabs(step.response[e].rate));
    return worst;
}

} // namespace

TEST_CASE("causes add up to the rate", "[causes]") {
    // Oracle: the rate itself; a dropped class of bounces must show.
    // Source: derived here.
    // Tolerance: 1e-9 of every rate, of all rays and of every batch.
    Feature scene;
    scene.sources.fast_neutrals = {{0, {"Ar", 40, 30, IonDistribution::thermal_fall(60, 2, 0.05)}}};
    SurfaceStep step = scene.solve();
    CHECK(largest_gap(step) < 1e-9);
    for (int b = 0; b < batches; ++b)
        for (std::size_t e = 0; e < step.response.size(); ++e)
            CHECK(sum_of(step.detail->cause_batch[b], e) ==
                  Approx(step.rate_batch[b][e]).epsilon(1e-9).margin(1e-12));
    for (int k = 0; k < cause_count; ++k) {
        const double whole = std::accumulate(step.cause[k].begin(), step.cause[k].end(), 0.0);
        INFO(k);
        const int path = k < neutral_cause ? k % ion_paths : -1;
        if (path == static_cast<int>(IonPath::after_more))
            CHECK(whole >= 0); // three bounces are rare here
        else
            CHECK((k == deposition_cause ? whole < 0 : whole > 0));
    }
    step.cause[enhanced_cause + 2].assign(step.response.size(), 0.0);
    CHECK(largest_gap(step) > 1e-6);
}

TEST_CASE("without reflected ions a frozen shape loses exactly their share", "[causes]") {
    // Oracle: the solve of the same surface with reflection off, sputtering alone.
    // Source: derived here (rates are linear in the tallies).
    // Tolerance: 1e-6 of every rate; the share of the first bounce alone must miss.
    Feature scene;
    scene.sputter_only();
    const SurfaceStep with = scene.solve();
    scene.reflection = {IonReflection{60, 1, 0}, IonReflection{60, 1, 0}};
    const SurfaceStep without = scene.solve();
    double worst = 0, first_alone = 0, largest_share = 0;
    for (std::size_t e = 0; e < with.response.size(); ++e) {
        double share = 0;
        for (int k = 1; k <= bounce_classes; ++k)
            share += with.cause[sputtering_cause + k][e];
        const double rate = with.response[e].rate, left = without.response[e].rate;
        worst = std::max(worst, std::fabs(rate - share - left) / rate);
        first_alone = std::max(first_alone,
                               std::fabs(rate - with.cause[sputtering_cause + 1][e] - left) / rate);
        largest_share = std::max(largest_share, share / rate);
    }
    CHECK(worst < 1e-6);
    CHECK(first_alone > 1e-4);
    CHECK(largest_share > 0.05);
}

TEST_CASE("fast neutrals act by the tallies of the ion that they were", "[causes]") {
    // Oracle: the same particles called ions. Their share of every rate is that of the flux.
    // Source: derived here.
    // Tolerance: rates and shares 1e-6 of the largest rate (one more pass through tables of
    // floats); a share of 0.24 must fail.
    using geometry::Symmetry;
    for (const auto symmetry : {Symmetry::extruded, Symmetry::revolved, Symmetry::full}) {
        Feature scene(1, symmetry);
        scene.sputter_only();
        scene.reflection.clear();
        const SurfaceStep ions = scene.solve();
        const IonDistribution all = scene.sources.ions[0].distribution;
        scene.sources.ions[0].flux = 75;
        scene.sources.fast_neutrals = {{0, {"Ar", 40, 25, all}}};
        const SurfaceStep split = scene.solve();
        double largest = 0;
        for (const auto& r : ions.response)
            largest = std::max(largest, r.rate);
        REQUIRE(largest > 0);
        double worst = 0, faulty = 0;
        for (std::size_t e = 0; e < ions.response.size(); ++e) {
            const double rate = ions.response[e].rate;
            const double share = split.cause[sputtering_cause + 4][e];
            worst = std::max({worst, std::fabs(split.response[e].rate - rate),
                              std::fabs(share - 0.25 * rate),
                              std::fabs(split.cause[sputtering_cause][e] - 0.75 * rate)});
            faulty = std::max(faulty, std::fabs(share - 0.24 * rate));
            CHECK(split.fast_neutral_flux[0][e] ==
                  Approx(0.25 * ions.ion_flux[0][e]).epsilon(1e-6).margin(1e-9));
        }
        CAPTURE(static_cast<int>(symmetry), worst / largest);
        CHECK(worst < 1e-6 * largest);
        CHECK(faulty > 1e-6 * largest);
    }
}

TEST_CASE("supplies answer as the rate of a covered surface does", "[causes]") {
    // Oracle: Langmuir balance, rate Y G theta / n with theta = s N / (s N + a Y G):
    // G dr/dG = r (1 - theta'), N dr/dN = r theta' with theta' = a Y G / (s N + a Y G); and Euler's
    // theorem, the sum of both is r.
    // Source: derived here.
    // Tolerance: 1e-6 relative (central differences of 1e-4).
    Mechanism mechanism;
    mechanism.ions = {"Ar+"};
    mechanism.neutrals = {"Cl"};
    mechanism.tallies = {{0, {ConstantLaw{2}, FlatAngle{}, 1}}};
    mechanism.surfaces = {
        {"silicon", 50, {"Cl"}, {Adsorption{0, 0, 0.5, 1, {}}, IonEnhancedEtching{0, 4, {0}}}}};
    for (const double neutral : {1.0, 100.0, 1e5}) {
        const double yield_flux = 2 * 30.0;
        // By paths: two thirds direct, one third after one bounce.
        const std::vector<double> paths = {40, 20, 0, 0, 0};
        const LocalArrivals arrivals{&yield_flux, &neutral, 300};
        const SurfaceResponse r = respond(mechanism, 0, arrivals);
        const SupplyRates supply = supply_rates(mechanism, 0, arrivals, paths.data());
        const double by_neutrals = 4 * yield_flux / (0.5 * neutral + 4 * yield_flux);
        CHECK(supply[ion_paths] == Approx(r.rate * by_neutrals).epsilon(1e-6));
        CHECK(supply[0] == Approx(2.0 / 3 * r.rate * (1 - by_neutrals)).epsilon(1e-6));
        CHECK(supply[1] == Approx(1.0 / 3 * r.rate * (1 - by_neutrals)).epsilon(1e-6));
        CHECK(std::accumulate(supply.begin(), supply.end(), 0.0) == Approx(r.rate).epsilon(1e-6));
        const CauseRates causes = cause_rates(mechanism, 0, r, paths.data());
        CHECK(causes[enhanced_cause] == Approx(2.0 / 3 * r.rate).epsilon(1e-12));
        CHECK(causes[enhanced_cause + 1] == Approx(1.0 / 3 * r.rate).epsilon(1e-12));
    }
}

TEST_CASE("wider ion angles raise the direct share at a bow", "[causes]") {
    // Oracle: below a neck the bow lies in the shadow of ions along the normal, and is etched by
    // those that walls narrowing above it reflect; the wider ions come the more reach it directly.
    // Source: common practice, no source.
    // Tolerance: from less than 1e-3 the share grows at least tenfold from each spread to the next,
    // to more than a tenth.
    double before = 0;
    for (const double transverse_ev : {0.02, 0.2, 2.0}) {
        Feature scene(transverse_ev);
        scene.surface = tests::polyline(scene.domain,
                                        {{-20, 0, 0},
                                         {-14, 0, 0},
                                         {-8, 0, -60},
                                         {-10, 0, -75},
                                         {-10, 0, -95},
                                         {-8, 0, -110},
                                         {8, 0, -110},
                                         {10, 0, -95},
                                         {10, 0, -75},
                                         {8, 0, -60},
                                         {14, 0, 0},
                                         {20, 0, 0}},
                                        1);
        scene.reach = {};
        for (std::size_t e = 0; e <= scene.surface.size(); ++e) {
            scene.reach.first.push_back(int(e));
            if (e < scene.surface.size()) scene.reach.material.push_back(0);
        }
        scene.sputter_only();
        const SurfaceStep step = scene.solve();
        double direct = 0, all = 0;
        for (std::size_t e = 0; e < step.response.size(); ++e) {
            const geometry::Vec3 p = scene.surface.centre[e], n = scene.surface.normal[e];
            if (std::fabs(n.x) < 0.9 || p.z > -75 || p.z < -95) continue;
            direct += step.cause[sputtering_cause][e];
            all += step.response[e].rate;
        }
        INFO(transverse_ev << " eV: " << direct / all);
        CHECK(direct / all > 10 * before);
        if (before == 0) CHECK(direct / all < 1e-3);
        before = direct / all;
    }
    CHECK(before > 0.1);
}
