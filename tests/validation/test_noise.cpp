// SPDX-License-Identifier: Apache-2.0
// What random sampling leaves in a profile: the two sides of a feature that is the same on both,
// and the roughness of walls and floors.
#include "engine/metrics.hpp"
#include "geometry/section.hpp"
#include "tests/support/run_quietly.hpp"

#include <catch2/catch.hpp>

#include <cmath>
#include <map>

using namespace rille;
using namespace rille::tests;
using geometry::Measured;

namespace {

constexpr double cell = 4; // nm

/// A trench in the middle of a full period, or a via; ions of some spread that reflect.
TrenchCase noisy(geometry::Symmetry symmetry, int ions, int rays, std::uint64_t seed) {
    TrenchCase t(128, cell, 40, 300);
    t.c.domain.symmetry = symmetry;
    t.add_opening("opening", 64);
    if (symmetry == geometry::Symmetry::revolved) {
        t.c.domain.cells_x /= 2;
        t.c.mask.openings.back().shape = geometry::Opening::Shape::round;
        t.c.mask.openings.back().width_y = 64;
    } else {
        t.c.domain.sides = geometry::Sides::periodic;
    }
    t.c.seed = seed;
    t.c.ions_per_species = ions;
    t.c.rays_per_element = rays;
    t.set_ions(60, fluxes::IonDistribution::gaussian(100, 0.12));
    for (const int material : {0, 1})
        t.c.reflection[material] = fluxes::IonReflection{};
    etch_by_ions(t, 0, {fluxes::SquareRootLaw{0.12, 10}, fluxes::PlateauCosine{78}, 1});
    t.add_step("main", 40);
    return t;
}

/// Differences of the two sides of one run, by name, with what their elements weigh.
std::map<std::string, Measured> differences(const engine::Case& c, const engine::SurfaceState& s) {
    const auto site = engine::feature_sites(c)[0];
    const geometry::Section section(c.domain, s.surface, 0, 0, site.centre_x, site.width_x);
    std::map<std::string, Measured> found;
    for (const int z : {-8, -16, -24}) {
        const auto gap = section.gap_at(z + 0.3);
        REQUIRE(gap);
        Measured& sum = found["wall at " + std::to_string(z) + " nm"];
        for (const auto* wall : {&gap->left, &gap->right}) {
            sum.value += wall->u; // zero of two walls that mirror each other
            sum.elements.emplace_back(wall->piece->element, 1 / wall->piece->normal_u);
        }
    }
    const auto subtract = [](const Measured& left, const Measured& right) {
        Measured difference = left;
        difference.value -= right.value;
        for (const auto& [element, weight] : right.elements)
            difference.elements.emplace_back(element, -weight);
        return difference;
    };
    const auto floor = geometry::floor_of(c.domain, s.surface, site);
    const auto angles = geometry::sidewall_angles(c.domain, s.surface, site, -24, -8);
    REQUIRE(floor);
    REQUIRE(angles);
    for (const int u : {10, 16, 22}) {
        Measured& sum = found["floor at " + std::to_string(u) + " nm"];
        for (const int side : {-1, 1}) {
            const auto at = section.floor_below(side * (u + 0.3), 0);
            REQUIRE(at);
            sum.value += side * at->z;
            sum.elements.emplace_back(at->piece->element, side / at->piece->normal_z);
        }
    }
    found["floor at the foot"] = subtract(floor->left_edge, floor->right_edge);
    found["sidewall angle"] = subtract(angles->left, angles->right);
    return found;
}

/// Root mean square of difference / standard error (the stated bar of 95 % over 2.36), over runs
/// that differ in the seed alone.
std::map<std::string, double> pulls_of_sides(int seeds, int ions) {
    std::map<std::string, double> squares, errors, spread;
    for (int seed = 1; seed <= seeds; ++seed) {
        const TrenchCase t = noisy(geometry::Symmetry::extruded, ions, 64, seed);
        const engine::SurfaceState last = run_quietly(t.c).last;
        for (const auto& [name, difference] : differences(t.c, last)) {
            const double sigma =
                engine::sampling_error(difference, last.displacement) / 2.364624; // 95 %, 7 degrees
            REQUIRE(sigma > 0);
            squares[name] += std::pow(difference.value / sigma, 2) / seeds;
            spread[name] += std::pow(difference.value, 2) / seeds;
            errors[name] += sigma * sigma / seeds;
        }
    }
    for (auto& [name, square] : squares) {
        square = std::sqrt(square);
        WARN(name << ": left - right " << std::sqrt(spread[name]) << " rms, stated "
                  << std::sqrt(errors[name]) << ", rms of their ratio " << square);
    }
    return squares;
}

/// Where walls and floor lie at fixed places, in cells.
struct Places {
    std::vector<double> wall, floor;
};

Places places_of(const engine::Case& c, const engine::SurfaceState& s) {
    const auto site = engine::feature_sites(c)[0];
    const geometry::Section section(c.domain, s.surface, 0, 0, site.centre_x, site.width_x);
    Places places;
    for (double z = -5; z > -26; z -= 1)
        if (const auto gap = section.gap_at(z)) places.wall.push_back(gap->right.u / cell);
    for (double u = 0; u < 26; u += 1)
        if (const auto floor = section.floor_below(u, 0)) places.floor.push_back(floor->z / cell);
    return places;
}

/// Standard deviation [cells] from run to run of the places of walls and floor, all together.
std::pair<double, double> roughness(geometry::Symmetry symmetry, int seeds, int ions, int rays) {
    std::vector<Places> runs;
    for (int seed = 1; seed <= seeds; ++seed) {
        const TrenchCase t = noisy(symmetry, ions, rays, seed);
        runs.push_back(places_of(t.c, run_quietly(t.c).last));
    }
    const auto spread = [&](std::vector<double> Places::*part) {
        const std::size_t count = (runs[0].*part).size();
        REQUIRE(count > 15);
        double squares = 0;
        for (std::size_t i = 0; i < count; ++i) {
            double mean = 0;
            for (const Places& run : runs) {
                REQUIRE((run.*part).size() == count);
                mean += (run.*part)[i] / seeds;
            }
            for (const Places& run : runs)
                squares += std::pow((run.*part)[i] - mean, 2) / (seeds - 1.0);
        }
        return std::sqrt(squares / count);
    };
    const std::pair<double, double> found{spread(&Places::wall), spread(&Places::floor)};
    WARN(ions << " ions, " << rays << " rays: walls " << found.first << " cells, floor "
              << found.second);
    return found;
}

} // namespace

// Oracle: two walls that mirror each other, in a full period without mirrors, stand at the same
// distance; what they differ by is noise, and the stated error is of just that difference.
// Source: definition of a standard error.
// Tolerance: rms of difference / sigma over 20 seeds between 0.5 and 1.5 where sigma is the
// standard error, the stated bar (of 95 %) over 2.36; bars 3.5 times as long or a third as long
// must fail.
TEST_CASE("left and right differ by the stated error", "[validation][noise]") {
    for (const auto& [name, pull] : pulls_of_sides(20, engine::Case().ions_per_species)) {
        INFO(name);
        CHECK(pull > 0.5);
        CHECK(pull < 1.5);
        CHECK(pull / 3.5 < 0.5);
        CHECK(pull * 3 > 1.5);
    }
}

// Oracle: the mean of runs that differ in the seed alone.
// Source: definition of roughness by sampling.
// Tolerance: with as many ions and rays as a case has unless it says otherwise, 0.05 cell on walls
// and 0.1 on floors; a hundredth of the ions and an eighth of the rays must be rougher than these
// runs.
TEST_CASE("sampling roughens walls and floors little", "[validation][noise]") {
    for (const auto symmetry : {geometry::Symmetry::extruded, geometry::Symmetry::revolved}) {
        INFO((symmetry == geometry::Symmetry::extruded ? "extruded" : "revolved"));
        const engine::Case by_default;
        const auto [walls, floor] =
            roughness(symmetry, 6, by_default.ions_per_species, by_default.rays_per_element);
        CHECK(walls > 0);
        CHECK(walls < 0.05);
        CHECK(floor > 0);
        CHECK(floor < 0.1);
        if (symmetry == geometry::Symmetry::revolved) continue;
        const auto fewer = roughness(symmetry, 4, 64, 8);
        CHECK(fewer.first > 2 * walls);
        CHECK(fewer.second > 2 * floor);
    }
}
