// SPDX-License-Identifier: Apache-2.0
#include "fluxes/reflected_ions.hpp"
#include "tests/support/lattice.hpp"
#include "tests/support/one_ion.hpp"

#include <catch2/catch.hpp>

#include <algorithm>
#include <cmath>

using namespace rille;
using namespace rille::fluxes;
using geometry::Domain;
using geometry::Surface;
using geometry::Vec3;
using tests::degree;
using tests::OneIon;
using tests::pi;

namespace {

/// Domes and hollows that repeat every `cells` along x and y, even about the middle and the sides
/// of that; of each way the whole or its upper half. All quads are plane.
struct Domes {
    Domain domain;
    Surface surface;

    Domes(int cells_x, int cells_y, bool half_x, bool half_y) {
        domain.symmetry = geometry::Symmetry::full;
        domain.cells_x = half_x ? cells_x / 2 : cells_x;
        domain.cells_y = half_y ? cells_y / 2 : cells_y;
        const auto height = [](int i, int cells, bool half) {
            return 0.12 * cells * std::cos(2 * pi * (half ? i : i - cells / 2) / cells);
        };
        surface = tests::lattice(domain.cells_x, domain.cells_y, [&](int i, int j) {
            return Vec3(domain.x_min() + i, domain.y_min() + j,
                        height(i, cells_x, half_x) + height(j, cells_y, half_y));
        });
    }
    int element(int i, int j) const { return i * domain.cells_y + j; }
};

/// Differs from element to element, the same on an element and its image.
std::vector<double> even_noise(const Domes& of, int lowest_i, int lowest_j) {
    std::vector<double> value;
    for (int i = 0; i < of.domain.cells_x; ++i)
        for (int j = 0; j < of.domain.cells_y; ++j) {
            const int k = i - lowest_i, l = j - lowest_j; // < 0 beyond the middle
            value.push_back(2 +
                            std::sin(12.9 * (k < 0 ? -1 - k : k) + 78.2 * (l < 0 ? -1 - l : l)));
        }
    return value;
}

ArcAverage without_turning(ArcAverage average) {
    for (ArcAverage::Part& part : average.parts)
        part.image = 0;
    return average;
}

} // namespace

TEST_CASE("a part of a shape in full between mirrors is averaged as the whole one is", "[direct]") {
    // Oracle: the mirror image: normals, averages of a field, tallies of a vertical beam at the own
    // normal and at turned ones; of all that the sum over the surface. Tolerance: round-off, 1e-6
    // for rows kept as float. Images that are not turned over must fail.
    const auto [cells_x, cells_y] =
        GENERATE(std::array<int, 2>{24, 16}, std::array<int, 2>{4, 16}, std::array<int, 2>{24, 2});
    const auto [half_x, half_y] =
        GENERATE(std::array<bool, 2>{true, false}, std::array<bool, 2>{false, true},
                 std::array<bool, 2>{true, true});
    CAPTURE(cells_x, cells_y, half_x, half_y);
    const Domes whole(cells_x, cells_y, false, false), part(cells_x, cells_y, half_x, half_y);
    const ArcAverage of_whole = arc_average(whole.domain, whole.surface),
                     of_part = arc_average(part.domain, part.surface);
    const auto normals = averaged_normals(whole.surface, of_whole),
               part_normals = averaged_normals(part.surface, of_part),
               unturned = averaged_normals(part.surface, without_turning(of_part));
    const auto value = even_noise(whole, cells_x / 2, cells_y / 2),
               part_value = even_noise(part, half_x ? 0 : cells_x / 2, half_y ? 0 : cells_y / 2);
    const auto beam = IonDistribution::beam(100, {0, 0, -1});
    const YieldFunction grazing{ConstantLaw{1.0}, PlateauCosine{45}, 1.0};
    const OneIon a(whole.domain, whole.surface, beam, 1, grazing),
        b(part.domain, part.surface, beam, 1, grazing);
    double leaning = 0, before = 0, after = 0;
    for (int i = 0; i < part.domain.cells_x; ++i)
        for (int j = 0; j < part.domain.cells_y; ++j) {
            const int e = part.element(i, j), twin = whole.element(i + (half_x ? cells_x / 2 : 0),
                                                                   j + (half_y ? cells_y / 2 : 0));
            CAPTURE(i, j);
            REQUIRE((whole.surface.normal[twin] - part.surface.normal[e]).length() < 1e-12);
            CHECK((normals[twin] - part_normals[e]).length() < 1e-12);
            CHECK(of_part.of(part_value, e) == Approx(of_whole.of(value, twin)).epsilon(1e-12));
            CHECK(b.ions.flux(0, e) == Approx(a.ions.flux(0, twin)).epsilon(1e-9));
            CHECK(b.ions.tally(0, e) == Approx(a.ions.tally(0, twin)).epsilon(1e-6));
            for (const double turned : {0.0, 0.2, 0.9, 1.4})
                CHECK(b.ions.tally_at(0, e, turned) ==
                      Approx(a.ions.tally_at(0, twin, turned)).epsilon(1e-6).margin(1e-9));
            leaning = std::max(leaning, (normals[twin] - unturned[e]).length());
            before += part.surface.area[e] * part_value[e];
            after += part.surface.area[e] * of_part.of(part_value, e);
        }
    CHECK(leaning > 0.05);
    CHECK(after == Approx(before).epsilon(1e-9));
}

TEST_CASE("images at a side leave the origin of reflected ions along a wall as it is",
          "[reflected]") {
    // Oracle: a vertical beam mirrored by a face 70 degrees steep comes at 40 degrees from the
    // zenith to the wall opposite, at a side of the period as between them. Source: geometry.
    // Tolerance: 1e-6; counted along x in place of the wall's normal it must fail.
    Domain d;
    d.symmetry = geometry::Symmetry::full;
    d.cells_x = 8;
    d.cells_y = 24;
    const double slope = std::tan(70 * degree);
    std::vector<Vec3> profile{{0, -12, 0}};
    const auto to = [&](double y, double z) {
        const Vec3 from = profile.back(), end(0, y, z);
        const int pieces = int(std::ceil((end - from).length()));
        for (int i = 1; i <= pieces; ++i)
            profile.push_back(from + (end - from) * (double(i) / pieces));
    };
    to(-6, 0), to(-6, -20), to(-2, -20), to(-2 + 20 / slope, 0), to(12, 0);
    const int along = int(profile.size()) - 1;
    const Surface s = tests::lattice(d.cells_x, along, [&](int i, int j) {
        return Vec3(d.x_min() + i, profile[j].y, profile[j].z);
    });
    IonReflection law;
    law.exponent = law.scatter_deg = law.collisions = 0;
    const OneIon one(d, s, IonDistribution::beam(100, {0, 0, -1}));
    const std::vector<int> material(s.size(), 0);
    ReflectionOptions options;
    options.ions_per_species = 20000;
    const auto reflected = trace_reflected(d, s, one.caster, material, one.ions, {law}, options);
    const DirectIons& direct = one.ions;
    const std::vector<double> ones(s.size(), 1.0);
    int met = 0;
    for (std::size_t e = 0; e < s.size(); ++e) {
        if (s.normal[e].y < 0.9 || s.centre[e].z > -15 || s.centre[e].z < -18) continue;
        INFO("wall at " << s.centre[e].x << ", " << s.centre[e].z);
        CHECK(std::fabs(reflected.from_angle[e] - 40 * degree) < 1e-6);
        if (std::fabs(s.centre[e].x) > 3) CHECK(direct.average()->of_sideways(ones, int(e)) < 0.5);
        ++met;
    }
    CHECK(met == 3 * d.cells_x);
}
