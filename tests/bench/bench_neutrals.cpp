// SPDX-License-Identifier: Apache-2.0
// Neutrals in a deep trench: the exact exchange against plain forward random walks, each to 1 % of
// the flux on the floor.
#include "fluxes/exact_exchange.hpp"
#include "tests/bench/timing.hpp"
#include "tests/support/shapes.hpp"

#include <nlohmann/json.hpp>
#include <tbb/global_control.h>

#include <cmath>
#include <iostream>
#include <random>

using namespace rille;
using namespace rille::bench;
using geometry::Domain;
using geometry::Hit;
using geometry::RayCaster;
using geometry::Surface;
using geometry::Vec3;

namespace {

constexpr double width = 20, aspect = 40, sticking = 0.01;
constexpr double exact_floor = 0.1492693; ///< closed_trench.csv, AR 40, s_w = s_b = 0.01
constexpr double goal_error = 0.01;

void by_cosine(std::mt19937_64& random, const Vec3& n, Vec3& direction) {
    std::uniform_real_distribution<double> u(0, 1);
    const double c = std::sqrt(1 - u(random)), s = std::sqrt(1 - c * c);
    const double a = 6.283185307179586 * u(random);
    const Vec3 t = Vec3(0, 1, 0); // normals lie in the plane y = 0
    direction = t * (s * std::cos(a)) + n.cross(t) * (s * std::sin(a)) + n * c;
}

struct Floor {
    double flux = 0, error = 0;
};

/// Walkers from all over the mouth, at it; every hit of the floor counts.
Floor walk(const Surface& surface, const RayCaster& caster, int walkers, std::uint64_t seed) {
    std::mt19937_64 random(seed);
    std::uniform_real_distribution<double> u(0, 1);
    double sum = 0, squares = 0;
    for (int w = 0; w < walkers; ++w) {
        Vec3 direction;
        by_cosine(random, {0, 0, -1}, direction);
        const Vec3 start((u(random) - 0.5) * width, 0, -1e-9);
        Hit hit = caster.trace(start, direction, -1);
        double hits = 0;
        while (hit.kind == Hit::Kind::surface && hit.point.z < 0) {
            hits += hit.point.z < -width * aspect + 1e-6;
            if (u(random) < sticking) break;
            by_cosine(random, surface.normal[hit.element], direction);
            hit = caster.trace(hit.point, direction, hit.element);
        }
        sum += hits, squares += hits * hits;
    }
    const double mean = sum / walkers;
    return {mean, std::sqrt((squares / walkers - mean * mean) / walkers)};
}

} // namespace

int main() {
    const tbb::global_control one(tbb::global_control::max_allowed_parallelism, 1);
    Domain domain;
    domain.cells_x = 30;
    const Surface surface = tests::trench(domain, width, aspect * width, 1);
    std::vector<double> stick(surface.size(), 0);
    for (std::size_t e = 0; e < stick.size(); ++e)
        if (surface.centre[e].z < -1e-6) stick[e] = sticking;
    const RayCaster caster(domain, surface, 1.0);

    std::size_t patches = 0;
    double floor = 0;
    Floor walked;
    constexpr int walkers = 4000;
    std::uint64_t seed = 0;
    const Comparison timing = compare(
        5,
        [&] {
            const fluxes::ExactExchange exchange(domain, surface, caster, {});
            const auto flux = exchange.solve(stick);
            patches = exchange.patches().size();
            floor = 0;
            for (std::size_t e = 0; e < flux.size(); ++e)
                if (surface.centre[e].z < -width * aspect + 1e-6)
                    floor += surface.area[e] * flux[e] / width;
        },
        [&] { walked = walk(surface, caster, walkers, ++seed); });
    // Time of a random walk goes as the inverse square of its error.
    const double wanted = std::pow(walked.error / (goal_error * exact_floor), 2);
    std::cout << nlohmann::json{{"bench", "neutrals"},
                                {"ratio", timing.ratio * wanted},
                                {"goal", 20},
                                {"exact_s", timing.ours},
                                {"walk_s", timing.theirs * wanted},
                                {"exact_error", std::fabs(floor / exact_floor - 1)},
                                {"walk_deviation", (walked.flux - exact_floor) / walked.error},
                                {"elements", surface.size()},
                                {"patches", patches},
                                {"note", "one thread each; floor of a trench, AR 40, sticking 0.01 "
                                         "everywhere; factors and solve against walks to a "
                                         "standard error of 1 %"}}
                     .dump()
              << std::endl;
}
