// SPDX-License-Identifier: Apache-2.0
#include "geometry/grown_films.hpp"
#include "tests/support/lattice.hpp"

#include <catch2/catch.hpp>

#include <algorithm>
#include <array>
#include <cmath>

using namespace rille;
using namespace rille::geometry;

namespace {

constexpr double pi = 3.14159265358979323846;
constexpr int cells_x = 16, cells_y = 12;

/// Of a shape that is even about the middle and the sides: all of it or the upper half each way.
struct Part {
    Domain domain;
    bool half_x, half_y;

    Part(bool half_along_x, bool half_along_y) : half_x(half_along_x), half_y(half_along_y) {
        domain.symmetry = Symmetry::full;
        domain.cells_x = half_x ? cells_x / 2 : cells_x;
        domain.cells_y = half_y ? cells_y / 2 : cells_y;
    }
    int from_middle_x(int i) const { return half_x ? i : i - cells_x / 2; }
    int from_middle_y(int j) const { return half_y ? j : j - cells_y / 2; }

    Surface surface(double height, double level) const {
        return tests::lattice(domain.cells_x, domain.cells_y, [&](int i, int j) {
            return Vec3(domain.x_min() + i, domain.y_min() + j,
                        level + height * (std::cos(2 * pi * from_middle_x(i) / cells_x) +
                                          std::cos(2 * pi * from_middle_y(j) / cells_y)));
        });
    }
    /// In [0, 1], differs from element to element, the same on an element and its image.
    std::vector<double> noise(double a, double b) const {
        std::vector<double> value;
        for (int i = 0; i < domain.cells_x; ++i)
            for (int j = 0; j < domain.cells_y; ++j) {
                const int k = from_middle_x(i), l = from_middle_y(j);
                value.push_back(
                    0.5 + 0.5 * std::sin(a * (k < 0 ? -1 - k : k) + b * (l < 0 ? -1 - l : l)));
            }
        return value;
    }
    int whole_element(int i, int j) const {
        return (i + (half_x ? cells_x / 2 : 0)) * cells_y + j + (half_y ? cells_y / 2 : 0);
    }
};

/// A film and an intensive field carried from one dome to another.
std::array<std::vector<double>, 2> carried(const Part& part, const Domain& domain, double& lost) {
    const Surface from = part.surface(2, 0), to = part.surface(1.7, -0.6);
    std::vector<double> moved = part.noise(5.1, 3.3);
    SurfaceField film{"film", Carry::per_area, part.noise(12.9, 78.2)};
    SurfaceField other{"other", Carry::intensive, part.noise(4.4, 1.7)};
    const auto integral = [&](const Surface& s) {
        double sum = 0;
        for (std::size_t e = 0; e < s.size(); ++e)
            sum += s.area[e] * film.value[e];
        return sum;
    };
    const double before = integral(from);
    carry_fields(from, to, moved, domain, {&film, &other});
    lost = 1 - integral(to) / before;
    return {film.value, other.value};
}

} // namespace

TEST_CASE("a part of a shape in full between mirrors carries what the whole one does", "[carry]") {
    // Oracle: the mirror image; a film is conserved. Source: symmetry (definition).
    // Tolerance: 1e-9; a part that repeats in place of being mirrored must fail.
    const auto [half_x, half_y] =
        GENERATE(std::array<bool, 2>{true, false}, std::array<bool, 2>{false, true},
                 std::array<bool, 2>{true, true});
    CAPTURE(half_x, half_y);
    const Part whole(false, false), part(half_x, half_y);
    Domain repeated = part.domain;
    repeated.sides = Sides::periodic;
    double lost = 0, lost_in_part = 0, ignored = 0;
    const auto all = carried(whole, whole.domain, lost),
               some = carried(part, part.domain, lost_in_part),
               fault = carried(part, repeated, ignored);
    CHECK(std::fabs(lost) < 1e-9);
    CHECK(std::fabs(lost_in_part) < 1e-9);
    for (const int field : {0, 1}) {
        double faulty = 0;
        for (int i = 0; i < part.domain.cells_x; ++i)
            for (int j = 0; j < part.domain.cells_y; ++j) {
                CAPTURE(field, i, j);
                const int e = i * part.domain.cells_y + j;
                const double expected = all[field][part.whole_element(i, j)];
                CHECK(some[field][e] == Approx(expected).margin(1e-9));
                faulty = std::max(faulty, std::fabs(fault[field][e] - expected));
            }
        CHECK(faulty > 0.01);
    }
}
