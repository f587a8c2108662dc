// SPDX-License-Identifier: Apache-2.0
// Round vias in r and z, etched through the whole program: closed forms, the same via in full three
// dimensions, the axis, roughness, threads.
#include "engine/case_file.hpp"
#include "engine/metrics.hpp"
#include "geometry/metrology.hpp"
#include "tests/support/run_quietly.hpp"

#include <catch2/catch.hpp>
#include <tbb/global_control.h>

#include <cmath>
#include <cstdio>
#include <string>

using namespace rille;
using namespace rille::tests;
using geometry::Vec3;

namespace {

constexpr double pi = 3.14159265358979323846;

/// A via of the given width in a round cell, or in the middle of a square one.
TrenchCase via_case(geometry::Symmetry symmetry, double pitch, double spacing, double width,
                    double film = 200) {
    TrenchCase t(pitch, spacing, 16, film);
    t.c.domain.symmetry = symmetry;
    if (symmetry == geometry::Symmetry::revolved) t.c.domain.cells_x /= 2;
    if (symmetry == geometry::Symmetry::full) t.c.domain.cells_y = t.c.domain.cells_x;
    t.add_opening("via", width);
    t.c.mask.openings.back().shape = geometry::Opening::Shape::round;
    t.c.mask.openings.back().width_y = width;
    return t;
}

/// Ions that spread, reflect and etch the more the more they graze; radicals that the film takes.
TrenchCase busy_via(geometry::Symmetry symmetry, double width = 32, bool reflect = true) {
    TrenchCase t = via_case(symmetry, 2 * width, 2, width);
    t.set_ions(40, fluxes::IonDistribution::gaussian(100, 0.04));
    t.c.ions_per_species = reflect ? 2048 : 0;
    for (const int material : {0, 1})
        if (reflect) t.c.reflection[material] = fluxes::IonReflection{};
    etch_by_ions(t, 0, {fluxes::SquareRootLaw{0.12, 10}, fluxes::PlateauCosine{78}, 1});
    fluxes::SpontaneousEtching etching;
    etching.neutral = t.add_neutral("F", 50);
    etching.probability.value = 0.3;
    t.chemistry(0).processes.push_back(etching);
    return t;
}

double volume_below(const geometry::Surface& s) {
    double sum = 0;
    for (const auto& c : s.corners) {
        const Vec3 a = s.vertices[c[0]], b = s.vertices[c[1]], m = (a + b) * 0.5;
        if (m.z < 0) sum -= 2 * pi * (a.x * a.z + 4 * m.x * m.z + b.x * b.z) / 6 * (b.x - a.x);
    }
    return sum;
}

/// Standard deviation of elements from the parabolas through those within 5 cells of arc, where
/// there is no corner as near [cells].
double roughness(const geometry::Surface& s, double cell, bool floor) {
    double squares = 0, count = 0;
    const int size = static_cast<int>(s.size()), reach = 5;
    for (int e = reach; e + reach < size; ++e) {
        bool smooth = true;
        for (int k = -reach; k <= reach; ++k)
            smooth = smooth && s.normal[e].dot(s.normal[e + k]) > 0.9;
        if (!smooth || s.centre[e].z > -2 * cell || (s.normal[e].z > 0.7) != floor) continue;
        const Vec3 n = s.normal[e], along(n.z, 0, -n.x);
        double m[5] = {}, f[3] = {}; // moments of u, and of height with 1, u, u^2
        for (int k = -reach; k <= reach; ++k) {
            const Vec3 d = s.centre[e + k] - s.centre[e];
            const double u = d.dot(along) / cell, w = d.dot(n) / cell;
            double power = 1;
            for (int i = 0; i < 5; ++i, power *= u) {
                m[i] += power;
                if (i < 3) f[i] += power * w;
            }
        }
        const auto det = [](double a, double b, double c, double d, double g, double h, double i,
                            double j, double k) {
            return a * (g * k - h * j) - b * (d * k - h * i) + c * (d * j - g * i);
        };
        const double all = det(m[0], m[1], m[2], m[1], m[2], m[3], m[2], m[3], m[4]);
        const double height = det(f[0], m[1], m[2], f[1], m[2], m[3], f[2], m[3], m[4]) / all;
        squares += height * height;
        ++count;
    }
    return count > 0 ? std::sqrt(squares / count) : 0;
}

} // namespace

TEST_CASE("a vertical beam etches a revolved via straight down", "[validation][revolved]") {
    // Oracle: a vertical beam deepens the via at flux * yield / density and leaves the walls alone.
    // Source: definition.
    // Tolerance: depth 0.05 cell; CDs 0.25 cell; no lost ray; a depth 2 % off must fail.
    TrenchCase t = via_case(geometry::Symmetry::revolved, 64, 2, 32);
    t.set_ions(50, straight_down());
    etch_by_ions(t, 0, flat_yield(1));
    t.add_step("main", 24.3);
    const auto outcome = run_quietly(t.c);
    const auto metrics = engine::measure(t.c, outcome.last);
    const double depth = metrics.find("depth centre")->value.value();
    CAPTURE(depth);
    CHECK(std::fabs(depth - 24.3) < 0.1);
    CHECK(std::fabs(depth - 1.02 * 24.3) > 0.1);
    const auto site = engine::feature_sites(t.c)[0];
    for (const double z : {-5.0, -13.0}) {
        CHECK(std::fabs(geometry::cd_at(t.c.domain, outcome.last.surface, site, z)->value - 32) <
              0.5);
        CHECK(std::fabs(geometry::cd_area_at(t.c.domain, outcome.last.surface, site, z)->value -
                        32) < 0.5);
    }
    CHECK(outcome.record.lost_rays == 0);
}

TEST_CASE("isotropic etching undercuts a revolved via", "[validation][revolved]") {
    // Oracle: isotropic etching by t under an opening of radius R removes pi R^2 t +
    // pi^2 R t^2 / 2 + 2 pi t^3 / 3.
    // Source: parallel body of a disk, derived here (Pappus).
    // Tolerance: 16 cells across and 3 cells deep, 2.5 % of the volume (2.04 % are measured: a
    // reach of three cells is coarse, in full it lacks 2.7 %); a reach that lags by a quarter of a
    // cell must fail.
    TrenchCase t = via_case(geometry::Symmetry::revolved, 96, 2, 32);
    const int radical = t.add_neutral("F", 5e5); // so much that the etch uses none up
    t.chemistry(0).density = 50;
    fluxes::SpontaneousEtching etching;
    etching.neutral = radical;
    etching.probability.value = 1e-4; // 1 nm/s
    t.chemistry(0).processes.push_back(etching);
    t.add_step("main", 6);
    const auto outcome = run_quietly(t.c);
    const double r = 16;
    const auto volume = [&](double by) {
        return pi * r * r * by + 0.5 * pi * pi * r * by * by + 2 * pi / 3 * by * by * by;
    };
    const double removed = volume_below(outcome.last.surface);
    CAPTURE(removed / volume(6));
    CHECK(std::fabs(removed / volume(6) - 1) < 0.025);
    CHECK(std::fabs(removed / volume(6.5) - 1) > 0.025);
}

TEST_CASE("revolved agrees with full on a via", "[validation][revolved][long]") {
    // Oracle: the same via, chemistry and plasma in full three dimensions.
    // Source: the two describe the same feature; the cells around it differ (round, square), which
    // a flat mask does not show below.
    // Tolerance: the stated sampling errors of both (95 %) added in squares, plus 0.25 cell
    // for the grids (0.3 at 1.5 cells under the mask) and 1 degree of the sidewall angle; 5 % less
    // of the ions must fail. Away from the foot, which either grid rounds in
    // its own way.
    const auto etched = [](geometry::Symmetry symmetry, double ions) {
        TrenchCase t = busy_via(symmetry);
        t.plasma().ion_flux *= ions;
        t.add_step("main", 28);
        const engine::SurfaceState last = run_quietly(t.c).last;
        const auto site = engine::feature_sites(t.c)[0];
        geometry::Measured depth = geometry::floor_of(t.c.domain, last.surface, site)->centre;
        std::vector<std::pair<double, double>> values{
            {-depth.value, engine::sampling_error(depth, last.displacement)}};
        for (const double z : {-3.0, -7.0, -11.0, -15.0}) {
            const auto cd = geometry::cd_at(t.c.domain, last.surface, site, z);
            values.emplace_back(cd->value, engine::sampling_error(*cd, last.displacement));
        }
        const auto angles = geometry::sidewall_angles(t.c.domain, last.surface, site, -15, -3);
        values.emplace_back(angles->left.value,
                            engine::sampling_error(angles->left, last.displacement));
        return values;
    };
    const auto full = etched(geometry::Symmetry::full, 1);
    const auto revolved = etched(geometry::Symmetry::revolved, 1);
    const auto fewer = etched(geometry::Symmetry::revolved, 0.95);
    for (std::size_t i = 0; i < full.size(); ++i) {
        // Under the mask 0.28 cell are measured, of the angle 0.6 degrees (it spans that place).
        const double grid = i + 1 == full.size() ? 1 : i == 1 ? 0.6 : 0.5;
        const double tolerance = std::hypot(full[i].second, revolved[i].second) + grid;
        WARN((i == 0                ? "depth "
              : i + 1 < full.size() ? "CD "
                                    : "sidewall angle ")
             << full[i].first << " +- " << full[i].second << " in full, " << revolved[i].first
             << " +- " << revolved[i].second);
        CHECK(std::fabs(full[i].first - revolved[i].first) < tolerance);
        if (i == 0) CHECK(std::fabs(full[i].first - fewer[i].first) > tolerance);
    }
}

TEST_CASE("steps of a revolved run may be long", "[validation][revolved]") {
    // Oracle: the same via by steps eight times shorter.
    // Source: convergence in time (definition); walls that a step leaves behind must not take the
    // reflected ions of the floor, which widened them by a share of the step.
    // Tolerance: 0.1 cell of the depth, 0.2 of CDs; a depth 5 % off must fail.
    const auto etched = [](double move) {
        TrenchCase t = busy_via(geometry::Symmetry::revolved);
        t.c.refresh_move = move;
        t.add_step("main", 20);
        const engine::SurfaceState last = run_quietly(t.c).last;
        const auto site = engine::feature_sites(t.c)[0];
        std::vector<double> values{
            -geometry::floor_of(t.c.domain, last.surface, site)->centre.value};
        for (const double z : {-3.0, -7.0, -11.0})
            values.push_back(geometry::cd_at(t.c.domain, last.surface, site, z)->value);
        return values;
    };
    const auto longer = etched(2), shorter = etched(0.25);
    for (std::size_t i = 0; i < longer.size(); ++i) {
        WARN((i ? "CD " : "depth ")
             << longer[i] << " by long steps, " << shorter[i] << " by short");
        CHECK(std::fabs(longer[i] - shorter[i]) < (i ? 0.4 : 0.2));
        if (i == 0) CHECK(std::fabs(1.05 * longer[i] - shorter[i]) > 0.2);
    }
}

TEST_CASE("a revolved via is smooth, its axis included", "[validation][revolved]") {
    // Oracle: shapes that vary over more than ten cells; under ions that do not reflect and
    // radicals the middle of the floor is flat, the axis no special place.
    // Source: noise of arrivals roughens a profile, physics here does not (derived here).
    // Tolerance: 0.05 cell on walls, 0.1 on floors (standard deviation from local parabolas); the
    // axis within 0.05 cell of the floor at 1 to 4 cells from it.
    TrenchCase t = busy_via(geometry::Symmetry::revolved, 64);
    t.add_step("main", 40);
    const auto outcome = run_quietly(t.c);
    const double walls = roughness(outcome.last.surface, 2, false);
    const double floor = roughness(outcome.last.surface, 2, true);
    WARN("roughness of walls " << walls << ", floor " << floor << " cells");
    CHECK(walls > 0);
    CHECK(walls < 0.05);
    CHECK(floor > 0);
    CHECK(floor < 0.1);
    CHECK(outcome.record.lost_rays == 0);

    TrenchCase plain = busy_via(geometry::Symmetry::revolved, 64, false);
    plain.add_step("main", 40);
    double on_axis = 0, beside = 0, count = 0;
    for (const Vec3& v : run_quietly(plain.c).last.surface.vertices) {
        if (v.x == 0) on_axis = v.z;
        if (v.x > 1 && v.x < 9) beside += v.z, count += 1;
    }
    WARN("axis " << (on_axis - beside / count) / 2 << " cells above the floor beside it");
    CHECK(std::fabs(on_axis - beside / count) < 0.05 * 2);
}

TEST_CASE("a revolved via of aspect ratio 40 reaches its stop", "[long][validation][revolved]") {
    // Oracle: what a via that deep looks like: it opens, nothing comes off, it narrows to the floor
    // by less than half and bows by less than its own width above that, and the floor is smooth at
    // its middle.
    // Source: common practice, no source; the width of the bow is that of the invented chemistry.
    // Tolerance: widths 0.5 to 2.6 times as drawn, the axis within a cell of the floor 1 to 4 cells
    // from it; at most 5 % of the refreshes without exact exchange of neutrals. Twice the widths
    // must fail.
    const engine::Case c =
        engine::load_case(std::string(RILLE_TESTS) + "/data/round_via_ar40.yaml");
    const auto result = run_quietly(c);
    REQUIRE(result.record.status == "done");
    CHECK(result.record.steps.back().reason == "reached stop at hole centre");
    CHECK(result.record.lost_rays == 0);
    int by_rays = 0;
    for (const std::string& warning : result.record.warnings) {
        WARN(warning);
        CHECK(warning.find("come off") == std::string::npos);
        CHECK(warning.find("closed") == std::string::npos);
        std::sscanf(warning.c_str(), "neutrals were exchanged by rays, with sampling error, in %d",
                    &by_rays);
    }
    CHECK(by_rays <= 0.05 * result.record.refreshes);

    const geometry::Surface& surface = result.last.surface;
    const auto site = engine::feature_sites(c)[0];
    CHECK(-geometry::floor_of(c.domain, surface, site)->centre.value ==
          Approx(1600).margin(1e-2 * c.domain.spacing));
    const auto sane = [&](double scale) {
        bool all = true;
        for (double z = -1580; z <= -10; z += 10) {
            const auto cd = geometry::cd_at(c.domain, surface, site, z);
            all = all && cd && scale * cd->value > 0.5 * 40 && scale * cd->value < 2.6 * 40;
        }
        return all;
    };
    CHECK(sane(1));
    CHECK_FALSE(sane(2));
    double on_axis = 0, beside = 0, count = 0;
    for (const Vec3& v : surface.vertices) {
        if (v.x == 0) on_axis = v.z;
        if (v.x > 1 && v.x < 9) beside += v.z, count += 1;
    }
    WARN("axis " << (on_axis - beside / count) / 2 << " cells above the floor beside it, "
                 << result.record.refreshes << " refreshes");
    CHECK(std::fabs(on_axis - beside / count) < 2);
}

TEST_CASE("a revolved run gives the same bits for any number of threads",
          "[validation][revolved]") {
    // Oracle: one thread. Source: disjoint outputs. Tolerance: none; another seed must differ.
    const auto run = [](int threads, int seed) {
        tbb::global_control limit(tbb::global_control::max_allowed_parallelism, threads);
        TrenchCase t = busy_via(geometry::Symmetry::revolved);
        t.c.seed = seed;
        t.add_step("main", 5);
        return run_quietly(t.c).last;
    };
    const auto one = run(1, 1), two = run(2, 1), other = run(2, 2);
    CHECK(one.surface.vertices == two.surface.vertices);
    CHECK(one.displacement == two.displacement);
    CHECK(one.rate == two.rate);
    CHECK(one.surface.vertices != other.surface.vertices);
}
