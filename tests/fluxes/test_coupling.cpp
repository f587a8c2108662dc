// SPDX-License-Identifier: Apache-2.0
#include "fluxes/exact_exchange.hpp"
#include "fluxes/surface_chemistry.hpp"
#include "fluxes/surface_step.hpp"
#include "tests/support/shapes.hpp"

#include <catch2/catch.hpp>

#include <cmath>

using namespace rille;
using namespace rille::fluxes;
using geometry::Domain;
using geometry::RayCaster;
using geometry::Surface;

namespace {

struct Knobs {
    double aspect, on_bare, on_film, film_flux, chlorine, eta;
};

/// A film-forming neutral, chlorine or not, and ions on a trench (invented numbers). Film comes and
/// goes over the floor as the fluxes change; the walls see few ions and are covered.
struct Scene {
    Domain domain;
    Surface surface;
    Mechanism mechanism;
    Sources sources;
    MaterialsInReach reach;

    explicit Scene(const Knobs& k) {
        domain.cells_x = 16;
        surface = tests::trench(domain, 10, 10 * k.aspect, 1);
        mechanism.ions = {"Ar+"};
        mechanism.neutrals = {"CF2"};
        mechanism.tallies = {{0, {SquareRootLaw{0.5, 16}, FlatAngle{}, 1}},
                             {0, {SquareRootLaw{0.02, 20}, YamamuraAngle{2, 65}, 1}}};
        SurfaceChemistry silicon{"silicon", 50, {"film"}, {}};
        silicon.processes = {Adsorption{0, 0, k.on_bare, 1, {k.eta, {0}}},
                             Deposition{0, 0, k.on_film, 40, 0, {}}, IonRemoval{0, {0}},
                             PhysicalSputtering{{SurfacePart::Kind::bare, -1}, {1}}};
        sources.ions = {{"Ar+", 40, 100, IonDistribution::thermal_fall(100, 0.5, 0.5)}};
        sources.neutrals = {{"CF2", k.film_flux, 300}};
        if (k.chlorine > 0) {
            mechanism.neutrals.push_back("Cl");
            sources.neutrals.push_back({"Cl", k.chlorine, 300});
            silicon.coverages.push_back("Cl");
            silicon.processes.push_back(Adsorption{1, 1, 0.3, 1, {}});
            silicon.processes.push_back(IonEnhancedEtching{1, 4, {0}});
            silicon.processes.push_back(NeutralRemoval{0, 1, {0.02, 0, 1e300}, 1});
        }
        mechanism.surfaces = {silicon};
        for (std::size_t e = 0; e <= surface.size(); ++e) {
            reach.first.push_back(int(e));
            if (e < surface.size()) reach.material.push_back(0);
        }
    }

    SurfaceStep solve(const SurfaceStep* previous = nullptr) const {
        const RayCaster caster(domain, surface, 2.0);
        return solve_surface(domain, surface, caster, reach, mechanism, {}, sources, {64, 0, 64, 1},
                             previous);
    }
    /// Largest difference, relative to the open flux, between the arrivals of the step and those
    /// that the sticking of its responses, times `fault`, gives.
    double miss(const SurfaceStep& step, double fault) const {
        const RayCaster caster(domain, surface, 2.0);
        const ExactExchange exchange(domain, surface, caster, {});
        double worst = 0;
        for (std::size_t k = 0; k < sources.neutrals.size(); ++k) {
            std::vector<double> sticking;
            for (const SurfaceResponse& r : step.response)
                sticking.push_back(fault * r.sticking[k]);
            const auto flux = exchange.solve(sticking);
            for (std::size_t e = 0; e < flux.size(); ++e)
                worst = std::max(
                    worst, std::fabs(flux[e] - step.neutral[k][e] / sources.neutrals[k].flux));
        }
        return worst;
    }
};

} // namespace

TEST_CASE("transport and kinetics converge wherever film comes and goes", "[coupling]") {
    // Oracle: the arrivals follow from the sticking that the kinetics answers to them.
    // Source: derived here.
    // Tolerance: 1e-5 of the open flux (sticking is solved to 1e-6); with every sticking 1 % off it
    // must be missed. No case may fail. A step that starts from a
    // steady state stays in it (1e-5 of the open flux).
    int cases = 0, relaxed = 0;
    bool stays = true;
    for (const double aspect : {2.0, 5.0, 12.0})
        for (const double on_film : {0.05, 0.5, 1.0})
            for (const double film_flux : {100.0, 300.0, 1000.0})
                for (const double chlorine : {0.0, 1000.0})
                    for (const double eta : {0.0, 0.01}) {
                        CAPTURE(aspect, on_film, film_flux, chlorine, eta);
                        const Scene scene({aspect, 0.1, on_film, film_flux, chlorine, eta});
                        SurfaceStep step;
                        ++cases;
                        REQUIRE_NOTHROW(step = scene.solve());
                        CHECK(step.residual < 1e-6);
                        CHECK(scene.miss(step, 1) < 1e-5);
                        CHECK(scene.miss(step, 1.01) > 1e-5);
                        relaxed += step.iterations > 12;
                        if (cases % 4 != 0) continue;
                        const SurfaceStep again = scene.solve(&step);
                        for (std::size_t k = 0; k < step.neutral.size(); ++k)
                            for (std::size_t e = 0; e < step.neutral[k].size(); ++e)
                                stays =
                                    stays && std::fabs(again.neutral[k][e] - step.neutral[k][e]) <
                                                 1e-5 * scene.sources.neutrals[k].flux;
                    }
    CHECK(cases == 108);
    CHECK(stays);
    CHECK(relaxed > 0); // some need more than Newton's method
}
