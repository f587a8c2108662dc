// SPDX-License-Identifier: Apache-2.0
// The front as a value: saving, threads, sides, export.
#include "geometry/check.hpp"
#include "tests/geometry/etch_loop.hpp"

#include <catch2/catch.hpp>
#include <tbb/global_control.h>

#include <cstdio>
#include <fstream>
#include <sstream>

using namespace rille::geometry;
using namespace rille::tests;

namespace {

/// A wavy front with a masked part, so that every branch of the scheme runs.
Front wavy(Symmetry symmetry, Sides sides, int cells) {
    const Domain d = make_domain(symmetry, sides, 1, cells, symmetry == Symmetry::full ? cells : 1);
    const double k = 2 * pi / d.width_x();
    return Front(
        d, [=](const Vec3& p) { return (p.z - 2 * std::cos(k * p.x) * std::cos(k * p.y)) / 1.3; },
        -3, 3);
}

Loop sputter(Symmetry symmetry) {
    Loop loop;
    loop.stack = Stack({{"top", 1, 10, 0.2}, {"thin", 0, 0.2, -0.4}, {"deep", 1, -0.4, -1e9}});
    loop.materials = 2;
    loop.angles = even_angles(symmetry == Symmetry::full ? 0 : -pi, pi, 180);
    loop.law = [](const Surface&, int, int material, double angle) {
        const double c = std::max(0.0, std::cos(angle));
        return (material ? 1.0 : 0.3) * c * (1 + 1.5 * (1 - c));
    };
    return loop;
}

bool same(const Front& a, const Front& b) {
    if (a.band().size() != b.band().size()) return false;
    for (std::size_t c = 0; c < a.band().size(); ++c) {
        const Band::Cell &p = a.band().cells[c], &q = b.band().cells[c];
        if (p.i != q.i || p.j != q.j || p.k != q.k || a.band().phi[c] != b.band().phi[c])
            return false;
    }
    return a.band().neighbour == b.band().neighbour;
}

} // namespace

TEST_CASE("saving and loading keeps every bit", "[front]") {
    // Oracle: the front that was never saved. Source: derived here. Tolerance: none.
    for (const Symmetry symmetry : {Symmetry::extruded, Symmetry::full}) {
        const Loop loop = sputter(symmetry);
        Front front = wavy(symmetry, Sides::periodic, 24);
        etch(front, loop, 1.5);
        std::stringstream file;
        front.save(file);
        Front loaded = Front::load(file);
        CHECK(same(front, loaded));
        etch(front, loop, 1.5);
        etch(loaded, loop, 1.5);
        CHECK(same(front, loaded));
        etch(loaded, loop, 0.1);
        CHECK(!same(front, loaded)); // should fail
    }
    std::stringstream broken("rfront01 and then nothing");
    CHECK_THROWS_AS(Front::load(broken), rille::NumericsError);
}

TEST_CASE("threads do not change a bit", "[front]") {
    // Oracle: the run on one thread. Source: derived here. Tolerance: none.
    const Loop loop = sputter(Symmetry::full);
    std::vector<Front> fronts;
    for (const int threads : {1, 2, 4}) {
        tbb::global_control limit(tbb::global_control::max_allowed_parallelism, threads);
        fronts.push_back(wavy(Symmetry::full, Sides::mirror, 40));
        etch(fronts.back(), loop, 1);
    }
    CHECK(fronts.front().band().size() > 8192); // enough for several ranges
    CHECK(same(fronts[0], fronts[1]));
    CHECK(same(fronts[0], fronts[2]));
}

TEST_CASE("a mirrored half equals the periodic whole", "[front]") {
    // Oracle: symmetry. Source: derived here. Tolerance: 1e-9 cells (order of sums).
    Loop loop = sputter(Symmetry::extruded);
    loop.stack = one_film(1);
    const auto shape = [](const Vec3& p) { return (p.z - 2 * std::cos(2 * pi * p.x / 48)) / 1.1; };
    Front whole(make_domain(Symmetry::extruded, Sides::periodic, 1, 48), shape, -3, 3);
    Front half(
        make_domain(Symmetry::extruded, Sides::mirror, 1, 24),
        [&](const Vec3& p) { return shape(p + Vec3(12, 0, 0)); }, -3, 3);
    etch(whole, loop, 6);
    etch(half, loop, 6);
    double mirror = 0, across = 0;
    for (std::size_t c = 0; c < whole.band().size(); ++c) {
        const Band::Cell& cell = whole.band().cells[c];
        const Vec3 p = whole.domain().node(cell.i, 0, cell.k);
        if (std::fabs(whole.band().phi[c]) > 1) continue;
        across = std::max(across, std::fabs(whole.distance(p) - whole.distance({-p.x, 0, p.z})));
        if (p.x > 0)
            mirror =
                std::max(mirror, std::fabs(whole.distance(p) - half.distance(p - Vec3(12, 0, 0))));
    }
    CAPTURE(mirror, across);
    CHECK(across < 1e-9);
    CHECK(mirror < 1e-9);
}

TEST_CASE("distance and export", "[front]") {
    // Oracle: the plane itself. Source: derived here. Tolerance: round-off.
    const Domain d = make_domain(Symmetry::full, Sides::periodic, 2, 10, 8);
    Front front(
        d, [](const Vec3& p) { return p.z - 0.7; }, 0.7, 0.7);
    CHECK(front.distance({3.3, -1.2, 1.9}) == Approx(1.2));
    CHECK(front.distance({103.3, 77, -2.1}) == Approx(-2.8));
    CHECK(front.distance({0, 0, 50}) == Approx(6));
    CHECK(front.distance({0, 0, -50}) == Approx(-6));
    CHECK(front.memory_bytes() > front.band().size() * 40);
    Front copy = front;
    copy.rebuild();
    CHECK(copy.distance({1, 1, 3}) == Approx(2.3));
    const std::string path = "front_export_test.vdb";
    front.write_vdb(path);
    std::ifstream file(path, std::ios::binary | std::ios::ate);
    CHECK(file.tellg() > 500);
    file.close();
    std::remove(path.c_str());
}
