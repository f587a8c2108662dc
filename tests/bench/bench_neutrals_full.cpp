// SPDX-License-Identifier: Apache-2.0
// Neutrals in a deep round hole in full: the exchange from rays against plain forward random walks,
// each to 3 % rms error of the flux on a cell of the floor.
#include "fluxes/exact_exchange.hpp"
#include "fluxes/exchange.hpp"
#include "tests/bench/timing.hpp"
#include "tests/support/revolved_shapes.hpp"

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

constexpr double pi = 3.14159265358979323846;
constexpr int across = 20, around = 64; // elements
constexpr double depth = 20.0 * across, wall_sticking = 0.01, floor_sticking = 0.1;
constexpr double goal_error = 0.03;

struct Hole {
    Domain domain;
    Surface surface;
    std::vector<double> sticking;
    std::vector<int> cell;         ///< of the floor, per element, or -1
    std::vector<double> cell_area; ///< about 1 each
    std::vector<int> ring;         ///< of each cell
    double mouth = pi * across * across / 4.0;
};

/// A polygon of the circle's area stands for it; the floor is cut into cells of about one element
/// of the wall.
Hole make_hole() {
    Hole h;
    h.domain.symmetry = geometry::Symmetry::full;
    h.domain.cells_x = h.domain.cells_y = 30;
    const double step = 2 * pi / around, r = across / 2.0 * std::sqrt(step / std::sin(step));
    std::vector<std::array<double, 2>> profile;
    for (int i = 0; i <= depth; ++i)
        profile.push_back({r, -double(i)});
    for (int i = across / 2 - 1; i >= 0; --i)
        profile.push_back({r * i / (across / 2), -depth});
    h.surface = tests::revolved_hole(h.domain, profile, around);
    const int n = int(h.surface.size()), floor = around * across / 2;
    h.sticking.assign(n, wall_sticking);
    h.cell.assign(n, -1);
    for (int e = 0; e < around; ++e)
        h.sticking[e] = 0; // the open surface about the hole
    int first = 0;
    for (int k = across / 2 - 1; k >= 0; --k) {
        const int cells = int(std::lround(pi * (2 * k + 1))), begin = n - floor;
        h.cell_area.resize(first + cells, 0.0);
        h.ring.resize(first + cells, k);
        for (int i = 0; i < around; ++i) {
            const int e = begin + (across / 2 - 1 - k) * around + i;
            h.sticking[e] = floor_sticking;
            h.cell[e] = first + i * cells / around;
            h.cell_area[h.cell[e]] += h.surface.area[e];
        }
        first += cells;
    }
    return h;
}

/// Flux on each ring of the floor by the exact exchange of the round hole.
std::vector<double> exact_rings() {
    const Domain domain = tests::round_cell(15);
    const Surface s = tests::round_hole(domain, across / 2.0, depth, 1);
    const RayCaster caster(domain, s, 1);
    std::vector<double> sticking;
    for (const Vec3& c : s.centre)
        sticking.push_back(c.z > -1e-6 ? 0 : c.z < -depth + 1e-6 ? floor_sticking : wall_sticking);
    const auto flux = fluxes::ExactExchange(domain, s, caster, {}).solve(sticking);
    return {flux.begin(), flux.begin() + across / 2};
}

Vec3 by_cosine(std::mt19937_64& random, const Vec3& n) {
    std::uniform_real_distribution<double> u(0, 1);
    const double c = std::sqrt(1 - u(random)), s = std::sqrt(1 - c * c), a = 2 * pi * u(random);
    const Vec3 t = (std::fabs(n.z) < 0.7 ? Vec3(0, 0, 1) : Vec3(1, 0, 0)).cross(n).normalized();
    return t * (s * std::cos(a)) + n.cross(t) * (s * std::sin(a)) + n * c;
}

/// Walkers from all over the mouth, at it; every hit of the floor counts.
std::vector<double> walk(const Hole& h, const RayCaster& caster, int walkers, std::uint64_t seed) {
    std::mt19937_64 random(seed);
    std::uniform_real_distribution<double> u(0, 1);
    std::vector<double> flux(h.cell_area.size(), 0.0);
    for (int w = 0; w < walkers; ++w) {
        const double r = across / 2.0 * std::sqrt(u(random)), a = 2 * pi * u(random);
        Hit hit = caster.trace({r * std::cos(a), r * std::sin(a), -1e-6},
                               by_cosine(random, {0, 0, -1}), -1);
        while (hit.kind == Hit::Kind::surface && hit.point.z < -1e-9) {
            if (const int c = h.cell[hit.element]; c >= 0)
                flux[c] += h.mouth / walkers / h.cell_area[c];
            if (u(random) < h.sticking[hit.element]) break;
            hit = caster.trace(hit.point, by_cosine(random, h.surface.normal[hit.element]),
                               hit.element);
        }
    }
    return flux;
}

std::vector<double> by_exchange(const Hole& h, const RayCaster& caster, int rays,
                                std::uint64_t refresh) {
    const fluxes::Exchange x(h.domain, h.surface, caster, {rays, 1, refresh});
    const auto all = x.solve(h.sticking, -1, {});
    std::vector<double> flux(h.cell_area.size(), 0.0);
    for (std::size_t e = 0; e < all.size(); ++e)
        if (const int c = h.cell[e]; c >= 0) flux[c] += all[e] * h.surface.area[e] / h.cell_area[c];
    return flux;
}

/// Mean square of the relative error over the cells.
double square_error(const Hole& h, const std::vector<double>& flux,
                    const std::vector<double>& exact) {
    double sum = 0;
    for (std::size_t c = 0; c < flux.size(); ++c)
        sum += std::pow(flux[c] / exact[h.ring[c]] - 1, 2) / double(flux.size());
    return sum;
}

} // namespace

int main() {
    const tbb::global_control one(tbb::global_control::max_allowed_parallelism, 1);
    const Hole hole = make_hole();
    const RayCaster caster(hole.domain, hole.surface, 1.0);
    const std::vector<double> exact = exact_rings();
    constexpr int repeats = 4, walkers = 40000, rays = 64, few_rays = 24;
    std::vector<double> ours, walked, few;
    std::uint64_t refresh = 0, seed = 0;
    const Comparison timing = compare(
        repeats,
        [&] {
            ours.push_back(square_error(hole, by_exchange(hole, caster, rays, ++refresh), exact));
        },
        [&] { walked.push_back(square_error(hole, walk(hole, caster, walkers, ++seed), exact)); });
    std::vector<double> few_s;
    for (int n = 0; n < 8; ++n)
        few_s.push_back(thread_seconds([&] {
            few.push_back(
                square_error(hole, by_exchange(hole, caster, few_rays, ++refresh), exact));
        }));
    const auto mean = [](const std::vector<double>& v) {
        double sum = 0;
        for (const double x : v)
            sum += x / double(v.size());
        return sum;
    };
    const double goal = goal_error * goal_error;
    const double walk_s = timing.theirs * mean(walked) / goal;
    // Time goes as the inverse square of the error.
    std::cout << nlohmann::json{{"bench", "neutrals_full"},
                                {"ratio", timing.ratio * mean(walked) / mean(ours)},
                                {"goal", 50},
                                {"ratio_24_rays_as_they_are", walk_s / median(few_s)},
                                {"exchange_s", timing.ours},
                                {"exchange_rms_error", std::sqrt(mean(ours))},
                                {"exchange_24_rays_s", median(few_s)},
                                {"exchange_24_rays_rms_error", std::sqrt(mean(few))},
                                {"walk_s_to_3_percent", walk_s},
                                {"walk_rms_error", std::sqrt(mean(walked))},
                                {"elements", hole.surface.size()},
                                {"floor_cells", hole.cell_area.size()},
                                {"note", "one thread each; flux on each cell of the floor of a "
                                         "round hole, AR 20, sticking 0.01 and 0.1; both scaled "
                                         "by their own squared errors against the exact exchange"}}
                     .dump()
              << std::endl;
}
