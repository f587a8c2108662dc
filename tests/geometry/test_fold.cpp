// SPDX-License-Identifier: Apache-2.0
// Parts of symmetric periods, and the whole made of them again.
#include "geometry/band.hpp"
#include "geometry/facets.hpp"
#include "geometry/fold.hpp"
#include "tests/geometry/etch_loop.hpp"
#include "tests/support/check_surface.hpp"

#include <catch2/catch.hpp>

#include <algorithm>
#include <array>
#include <map>
#include <set>
#include <utility>

using namespace rille::geometry;
using rille::tests::make_domain;
using rille::tests::pi;

namespace {

/// Hollows under a wavy surface, even about the middle and the sides of a period, with voids on the
/// middle and off it. Solid where < 0; `at` counts from the middle of the whole.
double hills_and_voids(const Domain& whole, const Vec3& at) {
    const double kx = 2 * pi / whole.width_x(), ky = 2 * pi / whole.width_y();
    const bool full = whole.symmetry == Symmetry::full;
    const double hills =
        at.z - 2.2 * std::cos(kx * at.x) - (full ? 1.7 * std::cos(ky * at.y) : 0.0);
    const auto bubble = [&](double x, double y, double z, double radius) {
        return radius -
               Vec3(std::fabs(at.x) - x, full ? std::fabs(at.y) - y : 0.0, at.z - z).length();
    };
    return std::max({hills / 1.5, bubble(0, 0, -9.3, 3.1), bubble(8.2, 4.1, -11.2, 2.6)});
}

Front front_of(const Domain& domain, const Domain& whole, const Vec3& origin) {
    return Front(
        domain, [=](const Vec3& p) { return hills_and_voids(whole, p + origin); }, -16, 6);
}

/// Of `b` the element whose centre lies nearest to that of each of `a`.
std::vector<int> nearest(const Surface& a, const Surface& b) {
    std::vector<int> found(a.size(), 0);
    for (std::size_t e = 0; e < a.size(); ++e)
        for (int f = 1; f < static_cast<int>(b.size()); ++f)
            if ((a.centre[e] - b.centre[f]).length() < (a.centre[e] - b.centre[found[e]]).length())
                found[e] = f;
    return found;
}

/// Directed edges without one that runs the other way, and those that there are twice.
std::pair<int, int> open_and_double_edges(const Surface& s) {
    std::map<std::pair<int, int>, int> edges;
    for (const auto& q : s.corners)
        for (int i = 0; i < 4; ++i) {
            const int a = q[i], b = q[(i + 1) % 4];
            if (a != b) ++edges[{a, b}];
        }
    int open = 0, twice = 0;
    for (const auto& [edge, count] : edges) {
        open += edges.count({edge.second, edge.first}) == 0;
        twice += count > 1;
    }
    return {open, twice};
}

/// Every element of the part is there once for each image, with what belongs to it.
void check_images(const Fold& fold, const Domain& domain, const Surface& part,
                  const Unfolded& all) {
    const Surface& s = all.surface;
    REQUIRE(s.size() == fold.copies() * part.size());
    std::vector<std::vector<int>> of(part.size());
    for (std::size_t e = 0; e < s.size(); ++e)
        of[all.source[e]].push_back(int(e));
    for (std::size_t e = 0; e < part.size(); ++e) {
        REQUIRE(int(of[e].size()) == fold.copies());
        for (int copy = 0; copy < fold.copies(); ++copy) {
            const Vec3 centre = fold.image(copy, part.centre[e] + fold.origin(domain));
            const auto here = std::find_if(of[e].begin(), of[e].end(), [&](int f) {
                return (s.centre[f] - centre).length() < 1e-12 * domain.width_x();
            });
            REQUIRE(here != of[e].end());
            CHECK((s.normal[*here] - fold.image(copy, part.normal[e])).length() < 1e-12);
            CHECK(s.area[*here] == part.area[e]);
            Vec3 middle(0, 0, 0);
            int corners = 0;
            for (const int v : s.corners[*here])
                if (v >= 0) middle += s.vertices[v], ++corners;
            if (corners == 4 && s.corners[*here][3] == s.corners[*here][2])
                middle -= s.vertices[s.corners[*here][3]], corners = 3;
            CHECK((middle / corners - centre).length() < 1e-12 * domain.width_x());
        }
    }
}

/// Pieces of `s` and of the whole are the same ones.
void check_chains(const Surface& s, const Surface& whole, const std::vector<int>& near) {
    std::set<std::pair<int, int>> pairs;
    for (std::size_t e = 0; e < s.size(); ++e)
        pairs.insert({s.chain[e], whole.chain[near[e]]});
    const std::set<int> here(s.chain.begin(), s.chain.end()),
        there(whole.chain.begin(), whole.chain.end());
    CHECK(here.size() == there.size());
    CHECK(pairs.size() == there.size());
    CHECK(pairs.count({0, 0}) == 1);
    CHECK(there.size() >= 4);
}

/// Elements of a chain lie one behind the other; the end of one that closes goes back to its start.
bool stored_in_walking_order(const Surface& s) {
    for (int e = 0; e < static_cast<int>(s.size()); ++e)
        if (s.next[e] > e + 1 || s.next[e] == e) return false;
    return true;
}

MaskShape trenches(std::initializer_list<std::pair<double, double>> centre_and_cd) {
    MaskShape mask;
    mask.thickness = 10;
    for (const auto& [centre, cd] : centre_and_cd) {
        Opening opening;
        opening.centre_x = centre;
        opening.width_x = cd;
        mask.openings.push_back(opening);
    }
    return mask;
}

MaskShape holes(std::initializer_list<std::array<double, 2>> centres) {
    MaskShape mask;
    mask.thickness = 10;
    for (const auto& centre : centres) {
        Opening opening;
        opening.shape = Opening::Shape::elliptic;
        opening.width_x = 6;
        opening.width_y = 4;
        opening.centre_x = centre[0];
        opening.centre_y = centre[1];
        mask.openings.push_back(opening);
    }
    return mask;
}

std::array<bool, 2> planes(const Domain& domain, const MaskShape& mask) {
    const Fold fold = symmetry_planes(domain, mask);
    return {fold.x, fold.y};
}

} // namespace

TEST_CASE("a part of a front unfolds to the surface and the level set of the whole", "[fold]") {
    // Oracle: the images of the part, and the front of the whole shape. Source: mirror symmetry
    // (definition). Tolerance: round-off; 0.04 cells and 0.15 rad where a void of 2.6 cells' radius
    // meets the plane (h^2 / 8 R and h / 2 R: a contour has its vertices there only at a side).
    const auto [symmetry, half_x, half_y] = GENERATE(
        std::make_tuple(Symmetry::extruded, true, false),
        std::make_tuple(Symmetry::full, true, false), std::make_tuple(Symmetry::full, false, true),
        std::make_tuple(Symmetry::full, true, true));
    CAPTURE(int(symmetry), half_x, half_y);
    const bool full = symmetry == Symmetry::full;
    const Domain d = make_domain(symmetry, Sides::mirror, 1, 28, full ? 20 : 1);
    const Fold fold{half_x, half_y};
    const Domain part_domain = fold.part(d);
    CHECK(fold.whole(part_domain).cells_x == d.cells_x);
    CHECK(fold.whole(part_domain).cells_y == d.cells_y);
    const Front whole = front_of(d, d, {0, 0, 0}),
                part = front_of(part_domain, d, fold.origin(part_domain));

    const Surface expected = extract_surface(whole), of_part = extract_surface(part);
    const Unfolded all = unfold(fold, part_domain, of_part);
    const Surface& s = all.surface;
    check_images(fold, part_domain, of_part, all);
    if (full) {
        CHECK(open_and_double_edges(s) == open_and_double_edges(expected));
        CHECK(s.vertices.size() == expected.vertices.size());
    } else {
        CHECK(rille::tests::consistent_chains(s, d));
        CHECK(stored_in_walking_order(s));
        CHECK(s.vertices.size() == expected.vertices.size() + 3); // where it meets the plane
    }
    const std::vector<int> near = nearest(s, expected);
    check_chains(s, expected, near);
    int equal = 0;
    for (std::size_t e = 0; e < s.size(); ++e) {
        const Vec3 &at = s.centre[e], &there = expected.centre[near[e]],
                   &normal = expected.normal[near[e]];
        const bool beside = (half_x && std::fabs(at.x) < 2.5) || (half_y && std::fabs(at.y) < 2.5);
        CHECK(std::fabs((at - there).dot(normal)) < (beside ? 0.04 : 1e-9));
        CHECK((s.normal[e] - normal).length() < (beside ? 0.15 : 1e-9));
        equal += (at - there).length() < 1e-9;
    }
    CHECK(equal > 0.6 * s.size());

    const Front unfolded = unfold(fold, part);
    REQUIRE(unfolded.band().size() == whole.band().size());
    double worst = 0;
    for (std::size_t c = 0; c < whole.band().size(); ++c) {
        const Band::Cell &a = whole.band().cells[c], &b = unfolded.band().cells[c];
        REQUIRE((a.i == b.i && a.j == b.j && a.k == b.k));
        worst = std::max(worst, std::fabs(whole.band().phi[c] - unfolded.band().phi[c]));
    }
    CHECK(worst < 1e-12);
    CHECK(unfolded.band().neighbour == whole.band().neighbour);
}

TEST_CASE("elements of an image are cut along the same diagonal and face the gas", "[fold]") {
    // Oracle: the facets that rays meet, mirrored; they look where the element does. Source:
    // definition. Tolerance: 1e-12.
    const Domain d = make_domain(Symmetry::full, Sides::mirror, 1, 28, 20);
    const Fold fold{true, true};
    const Domain part_domain = fold.part(d);
    const Surface part = extract_surface(front_of(part_domain, d, fold.origin(part_domain)));
    const Unfolded all = unfold(fold, part_domain, part);
    const auto cut = [](const Surface& s, std::size_t e) {
        std::array<Vec3, 2> facets;
        for (const int which : {0, 1})
            facets[which] = facet(s.vertices, s.corners[e], which).cross();
        if (facets[0].z < facets[1].z) std::swap(facets[0], facets[1]);
        return facets;
    };
    for (std::size_t e = 0; e < all.surface.size(); ++e) {
        const auto of_part = cut(part, all.source[e]), here = cut(all.surface, e);
        const auto& n = all.surface.normal[e];
        for (const int i : {0, 1}) {
            CHECK(here[i].length() == Approx(of_part[i].length()).margin(1e-12));
            CHECK(here[i].z == Approx(of_part[i].z).margin(1e-12));
        }
        CHECK((here[0] + here[1]).dot(n) > 0);
    }
}

TEST_CASE("what is symmetric about the middle of a period is found", "[fold]") {
    // Oracle: by hand. Source: definition.
    using Planes = std::array<bool, 2>;
    const Planes neither{false, false}, x{true, false}, y{false, true}, both{true, true};
    const Domain trench = make_domain(Symmetry::extruded, Sides::mirror, 1, 40);
    CHECK(planes(trench, trenches({{0, 12}})) == x);
    CHECK(planes(trench, trenches({})) == x);
    CHECK(planes(trench, trenches({{0.1, 12}})) == neither);
    CHECK(planes(trench, trenches({{-10, 6}, {10, 6}})) == x);
    CHECK(planes(trench, trenches({{-10, 6}, {0, 2}, {10, 6}})) == x);
    CHECK(planes(trench, trenches({{-10, 6}, {10, 7}})) == neither);
    CHECK(planes(trench, trenches({{-10, 6}, {9, 6}})) == neither);
    CHECK(planes(make_domain(Symmetry::extruded, Sides::mirror, 1, 41), trenches({{0, 12}})) ==
          neither);
    CHECK(planes(make_domain(Symmetry::extruded, Sides::periodic, 1, 40), trenches({{0, 12}})) ==
          neither);
    CHECK(planes(make_domain(Symmetry::revolved, Sides::mirror, 1, 40), holes({{0, 0}})) ==
          neither);

    const Domain full = make_domain(Symmetry::full, Sides::mirror, 1, 40, 30);
    CHECK(planes(full, holes({{0, 0}})) == both);
    CHECK(planes(full, holes({{0, 3}})) == x);
    CHECK(planes(full, holes({{-8, 0}})) == y);
    CHECK(planes(full, holes({{-8, 3}, {8, 3}})) == x);
    CHECK(planes(full, holes({{-8, 3}, {8, -3}})) == neither);
    CHECK(planes(full, holes({{-8, 3}, {8, -3}, {8, 3}, {-8, -3}})) == both);
    CHECK(planes(full, trenches({{0, 12}})) == both);
    CHECK(planes(make_domain(Symmetry::full, Sides::mirror, 1, 41, 30), holes({{0, 0}})) == y);
    CHECK(planes(make_domain(Symmetry::full, Sides::mirror, 1, 40, 31), holes({{0, 0}})) == x);
}
