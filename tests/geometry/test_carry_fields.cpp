// SPDX-License-Identifier: Apache-2.0
#include "geometry/extract_surface.hpp"
#include "geometry/grown_films.hpp"
#include "tests/geometry/etch_loop.hpp"
#include "tests/support/make_band.hpp"

#include <catch2/catch.hpp>

#include <numeric>

using namespace rille;
using namespace rille::geometry;
using namespace rille::tests;

namespace {

using Distance = std::function<double(const Vec3&)>;

Domain domain(bool full, int cells, Sides sides) {
    Domain d;
    d.symmetry = full ? Symmetry::full : Symmetry::extruded;
    d.sides = sides;
    d.cells_x = cells;
    d.cells_y = full ? cells : 1;
    return d;
}

double integral(const Surface& s, const std::vector<double>& v) {
    double sum = 0;
    for (std::size_t e = 0; e < s.size(); ++e)
        sum += s.area[e] * v[e];
    return sum;
}

void carry(const Surface& from, const Surface& to, const std::vector<double>& moved,
           const Domain& d, std::vector<SurfaceField*> fields) {
    carry_fields(from, to, moved, d, fields);
}

/// Largest relative deviation from `value` away from the sides and from places `skip` marks.
double deviation(const Surface& s, const std::vector<double>& v, double value,
                 const std::function<bool(const Vec3&)>& skip) {
    double worst = 0;
    for (std::size_t e = 0; e < s.size(); ++e)
        if (!skip(s.centre[e])) worst = std::max(worst, std::fabs(v[e] / value - 1));
    return worst;
}

/// Half-round pit of radius 18 cells, or a cusp: two such arcs that meet in a tip.
Distance pit(const Vec3& at, bool cusp) {
    return [=](const Vec3& q) {
        const Vec3 p = q - at;
        const auto arc = [](double x, double z) { return 18 - std::hypot(x, z); };
        if (!cusp) return std::max(arc(p.x, p.z), p.z);
        return std::max(std::max(arc(p.x - 14, p.z), arc(p.x + 14, p.z)), p.z);
    };
}

} // namespace

namespace {

struct IdleResult {
    double thickness = 0; ///< largest relative change of one element's
    double mass = 0;      ///< relative change of the film's
    double shift = 0;     ///< [cells] summed over the redistancings
    double depth = 0;     ///< [cells] of the slot beside it
    int resized = 0;      ///< calls after which the front had another number of elements
};

/// A film of 0.5 cell on a pit that rests through `calls` chains of advance, redistancing where it
/// is due, contouring and carrying. A slot beside it sinks by `sink` cells a call, `spoil` a factor
/// of the distances at the start. The carry may be led astray by `slip`: the rest of the front is
/// then said to have moved.
IdleResult idle_film(bool cusp, double sink, double spoil, int calls, double slip = 0) {
    const Domain d = make_domain(Symmetry::extruded, Sides::mirror, 1, cusp ? 110 : 80);
    const double slot = cusp ? 43 : 28;
    const Distance shape = pit(Vec3(cusp ? -20.3 : -18, 0, 0.2), cusp);
    Front front(
        d,
        [&](const Vec3& p) {
            const double in = 5 - std::fabs(p.x - slot);
            return spoil * std::max(shape(p), std::min(in, p.z + 3));
        },
        -22, 3);
    Surface s = extract_surface(front);
    const auto rests = [&](const Surface& on, std::size_t e) { return on.centre[e].x < slot - 8; };
    GrownFilms films{{1}, {std::vector<double>(s.size(), 0.0)}};
    const auto mass = [&] {
        double sum = 0;
        for (std::size_t e = 0; e < s.size(); ++e)
            sum += rests(s, e) ? films.thickness[0][e] * s.area[e] : 0;
        return sum;
    };
    for (std::size_t e = 0; e < s.size(); ++e)
        if (rests(s, e)) films.thickness[0][e] = 0.5;
    const double before = mass();
    IdleResult out;
    for (int n = 0; n < calls; ++n) {
        const auto rates = make_rates(
            s, even_angles(-pi, pi, 90), 2, [&](const Surface& on, int e, int, double a) {
                const bool lit = std::fabs(on.centre[e].x - slot) < 5.2 && on.centre[e].z < -0.5;
                return lit ? sink * std::max(0.0, std::cos(a)) : 0.0;
            });
        AdvanceLimits limits;
        limits.time = 1;
        auto report = advance(front, s, rates, one_film(), films, std::vector<int>(s.size(), -1),
                              -1e9, limits);
        out.shift += report.redistance_shift;
        const Surface next = extract_surface(front);
        for (std::size_t e = 0; e < s.size(); ++e)
            report.moved[e] += s.centre[e].z < -2 ? slip * (n % 2 ? 1 : -1) : 0;
        SurfaceField film{"film", Carry::per_area, films.thickness[0]};
        carry(s, next, report.moved, d, {&film});
        films.thickness[0] = film.value;
        out.resized += next.size() != s.size();
        s = next;
    }
    for (std::size_t e = 0; e < s.size(); ++e) {
        if (rests(s, e))
            out.thickness = std::max(out.thickness, std::fabs(films.thickness[0][e] / 0.5 - 1));
        out.depth = std::max(out.depth, -s.centre[e].z);
    }
    out.mass = mass() / before - 1;
    return out;
}

} // namespace

TEST_CASE("a grown film on an idle front keeps its thickness and mass", "[carry]") {
    // Oracle: nothing moves, so nothing changes, whatever the rest of the front does.
    // Source: derived here. Tolerance: thickness 2 %, mass 1e-6 over 1,000 calls.
    for (const bool cusp : {false, true})
        for (const double sink : {0.0, 0.05})
            for (const double spoil : {1.0, 1.35}) {
                if (sink == 0 && spoil == 1) continue; // nothing at all happens
                const IdleResult r = idle_film(cusp, sink, spoil, 1000);
                WARN((cusp ? "cusp" : "arc")
                     << ", slot sinks by " << sink << ", distances times " << spoil
                     << ": thickness off by " << r.thickness << ", mass " << r.mass << ", shift "
                     << r.shift << ", depth " << r.depth << ", resized " << r.resized);
                CHECK(r.thickness < 0.02);
                CHECK(std::fabs(r.mass) < 1e-6);
                CHECK((r.shift > 0) == (spoil > 1));
                if (sink == 0) continue;
                CHECK(r.depth > 50);
                CHECK(r.resized > 50);
            }
    // should fail: a front said to move to and fro by 0.2 cell
    CHECK(idle_film(true, 0, 1, 20, 0.2).thickness > 0.02);
}

TEST_CASE("elements that stay keep their bits", "[carry]") {
    // Oracle: nothing moves. Source: derived here. Tolerance: none.
    for (const bool cusp : {false, true}) {
        const Domain d = domain(false, 80, Sides::mirror);
        const Surface s = extract_surface(make_band(d, pit(Vec3(0.3, 0, 0.2), cusp), -22, 3));
        std::vector<double> idle(s.size(), 0.0);
        SurfaceField film{"film", Carry::per_area, std::vector<double>(s.size(), 0.5)};
        SurfaceField cover{"cover", Carry::intensive, {}};
        for (std::size_t e = 0; e < s.size(); ++e) {
            film.value[e] += 0.01 * std::sin(e);
            cover.value.push_back(std::cos(0.3 * e));
        }
        const auto film_before = film.value, cover_before = cover.value;
        Surface other = s; // an element elsewhere has moved
        other.vertices.front().z += 1e-3;
        other.centre.front().z += 5e-4;
        for (int n = 0; n < 1000; ++n)
            carry(s, other, idle, d, {&film, &cover});
        for (std::size_t e = 3; e < s.size(); ++e) {
            CHECK(film.value[e] == film_before[e]);
            CHECK(cover.value[e] == cover_before[e]);
        }
    }
}

TEST_CASE("a grown film on a moving front", "[carry]") {
    // Oracle: a front that is carried to and fro by up to a cell ends where it started, and so does
    // all that lies on it (along normals a point of a curved front drifts, but back again): an even
    // film, and one that swells and thins by 40 % every 16 cells.
    // Source: derived here. Tolerance: mass 1e-12 per call, 1e-6 overall; after 200 moves every
    // element more than 6 cells from a corner within 2 % (0.3 % measured), the uneven film within
    // 10 % of its mean (7.5 %: its crests are levelled by a quarter). Next to an edge of the solid,
    // where each move takes a stretch of film away or lays one bare, the mean over 5 elements keeps
    // within 8 % (6 % measured).
    for (const bool cusp : {false, true}) {
        const Domain d = domain(false, 80, Sides::mirror);
        const auto place = [](int n) {
            return Vec3(0.3 + 0.3 * std::sin(1.7 * n), 0, 0.2 + 0.5 * std::sin(0.9 * n));
        };
        const auto front = [&](int n) {
            return extract_surface(make_band(d, pit(place(n), cusp), -22, 3));
        };
        const auto wave = [&](const Vec3& q) {
            const Vec3 p = q - place(0);
            const double side = cusp ? std::copysign(14, p.x) : 0;
            const double arc = 18 * std::atan2(p.x - side, -p.z);
            return 0.5 * (1 + 0.4 * std::cos(2 * pi * arc / 16));
        };
        Surface s = front(0);
        SurfaceField film{"film", Carry::per_area, std::vector<double>(s.size(), 0.5)};
        SurfaceField uneven{"uneven", Carry::per_area, {}};
        for (const Vec3& c : s.centre)
            uneven.value.push_back(wave(c));
        const double mass = integral(s, film.value);
        double worst_call = 0;
        for (int n = 1; n <= 201; ++n) {
            const Vec3 step = place(n % 201) - place(n - 1);
            const Surface next = front(n % 201);
            std::vector<double> moved(s.size());
            for (std::size_t e = 0; e < s.size(); ++e)
                moved[e] = -step.dot(s.normal[e]);
            const double before = integral(s, film.value);
            carry(s, next, moved, d, {&film, &uneven});
            worst_call = std::max(worst_call, std::fabs(integral(next, film.value) / before - 1));
            s = next;
        }
        const auto near_corner = [&](const Vec3& q) {
            const Vec3 p = q - place(0);
            return (cusp && std::fabs(p.x) < 6) || p.z > -6;
        };
        std::vector<double> mean(s.size());
        double wave_off = 0;
        for (int e = 0; e < static_cast<int>(s.size()); ++e) {
            double sum = 0, length = 0;
            for (int f = std::max(0, e - 2); f < std::min<int>(s.size(), e + 3); ++f) {
                sum += s.area[f] * film.value[f];
                length += s.area[f];
            }
            mean[e] = sum / length;
            if (!near_corner(s.centre[e]))
                wave_off = std::max(wave_off, std::fabs(uneven.value[e] - wave(s.centre[e])) / 0.5);
        }
        const double off = deviation(s, film.value, 0.5, near_corner);
        const double at_corners = deviation(s, mean, 0.5, [](const Vec3&) { return false; });
        WARN((cusp ? "cusp" : "arc")
             << ": mass " << integral(s, film.value) / mass - 1 << ", worst call " << worst_call
             << ", single elements off by " << off << ", means at corners by " << at_corners
             << ", uneven film by " << wave_off);
        CHECK(worst_call < 1e-12);
        CHECK(integral(s, film.value) == Approx(mass).epsilon(1e-6));
        CHECK(off < 0.02);
        CHECK(at_corners < 0.08);
        CHECK(wave_off < 0.1);
    }
}

TEST_CASE("films merge at concave and spread at convex places", "[carry]") {
    // Oracle: h_new = h A_old / A_new on a circle that grows or shrinks. Source: derived here.
    // Tolerance: root mean square 1 % in extruded, 5 % in full (whose elements differ much in size;
    // single ones are off by up to 15 %), 1e-12 of the mass.
    for (const bool full : {false, true})
        for (const double moved : {0.4, -0.4}) {
            const Domain d = domain(full, 40, Sides::periodic);
            const double radius = 12, after = radius - moved;
            const auto ball = [](double r) {
                return [r](const Vec3& p) { return (p - Vec3(0.2, 0, 0.1)).length() - r; };
            };
            const Surface a = extract_surface(make_band(d, ball(radius), -13, 13));
            const Surface b = extract_surface(make_band(d, ball(after), -13, 13));
            SurfaceField film{"film", Carry::per_area, std::vector<double>(a.size(), 0.5)};
            SurfaceField height{"height", Carry::intensive, {}};
            for (const Vec3& c : a.centre)
                height.value.push_back(c.z / radius);
            carry(a, b, std::vector<double>(a.size(), moved), d, {&film, &height});
            CHECK(integral(b, film.value) ==
                  Approx(0.5 * integral(a, std::vector<double>(a.size(), 1.0))).epsilon(1e-12));
            const double expected = 0.5 * std::pow(radius / after, full ? 2 : 1);
            double square = 0;
            for (double v : film.value)
                square += (v / expected - 1) * (v / expected - 1);
            CAPTURE(full, moved);
            CHECK(std::sqrt(square / b.size()) < (full ? 0.05 : 0.01));
            double worst = 0;
            for (std::size_t e = 0; e < b.size(); ++e)
                worst = std::max(worst, std::fabs(height.value[e] - b.centre[e].z / after));
            CHECK(worst < 0.02);
        }
}

TEST_CASE("films on a moving full front", "[carry]") {
    // Oracle: a rigid translation keeps thickness and mass. Source: derived here.
    // Tolerance: mass 1e-12 per call; thickness 2 % root mean square after 40 moves (1.8 %
    // measured), single small elements 12 % (8 %).
    const Domain d = domain(true, 36, Sides::periodic);
    const auto ball = [](const Vec3& c) {
        return [c](const Vec3& p) {
            Vec3 v = p - c;
            v.x -= 36 * std::round(v.x / 36);
            v.y -= 36 * std::round(v.y / 36);
            return v.length() - 12;
        };
    };
    const auto place = [](int n) {
        return Vec3(0.4 * std::sin(1.7 * n), 0.3 * std::sin(2.1 * n), 0.4 * std::sin(0.9 * n));
    };
    Surface s = extract_surface(make_band(d, ball({0, 0, 0}), -13, 13));
    SurfaceField film{"film", Carry::per_area, std::vector<double>(s.size(), 0.5)};
    const double mass = integral(s, film.value);
    double worst_call = 0;
    for (int n = 1; n <= 41; ++n) {
        const Vec3 at = place(n % 41), step = at - place(n - 1);
        const Surface next = extract_surface(make_band(d, ball(at), at.z - 13, at.z + 13));
        std::vector<double> moved(s.size());
        for (std::size_t e = 0; e < s.size(); ++e)
            moved[e] = -step.dot(s.normal[e]);
        const double before = integral(s, film.value);
        carry(s, next, moved, d, {&film});
        worst_call = std::max(worst_call, std::fabs(integral(next, film.value) / before - 1));
        s = next;
    }
    const double off = deviation(s, film.value, 0.5, [](const Vec3&) { return false; });
    double square = 0;
    for (double v : film.value)
        square += (v / 0.5 - 1) * (v / 0.5 - 1);
    WARN("full: mass " << integral(s, film.value) / mass - 1 << ", worst call " << worst_call
                       << ", thickness off by at most " << off << ", rms "
                       << std::sqrt(square / s.size()));
    CHECK(worst_call < 1e-12);
    CHECK(std::sqrt(square / s.size()) < 0.02);
    CHECK(off < 0.12);
    CHECK(*std::min_element(film.value.begin(), film.value.end()) > 0);
}
