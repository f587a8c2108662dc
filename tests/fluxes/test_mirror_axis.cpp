// SPDX-License-Identifier: Apache-2.0
#include "fluxes/direct_ions.hpp"
#include "tests/support/lattice.hpp"
#include "tests/support/one_ion.hpp"
#include "tests/support/revolved_shapes.hpp"

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

constexpr double sphere = 15; // radius

/// A round hole with a domed floor about the axis, which falls away by `fall` [rad] at its foot.
Surface domed_hole(const Domain& d, double fall, double depth, double length) {
    std::vector<Vec3> points;
    const int steps = int(std::ceil(sphere * fall / length));
    for (int i = 0; i <= steps; ++i) {
        const double a = fall * i / steps;
        points.push_back({sphere * std::sin(a), 0, sphere * (std::cos(a) - 1) - depth});
    }
    const double wall = points.back().x;
    points.insert(points.end(), {{wall, 0, 0}, {d.width_x(), 0, 0}});
    return tests::frusta(d, points, length);
}

/// What an ion of one element brings to normals of its own, from the ions that are known to reach
/// it.
double brought(const DirectIons& ions, const YieldFunction& yield, int e, double psi) {
    double sum = 0;
    for (int b = 0; b < 8; ++b)
        for (int k = 0; k < ions.rays_per_batch(); ++k) {
            if (!ions.arrives(0, e, b, k)) continue;
            const IonSample ion = ions.ion(0, e, b, k);
            const Vec3 from = -ion.direction;
            const double cosine = std::cos(psi) * from.z + std::sin(psi) * from.x;
            if (cosine > 0) sum += yield(ion.energy_ev, cosine) * cosine / from.z;
        }
    return sum / (8 * ions.rays_per_batch());
}

} // namespace

TEST_CASE("averages reach over the axis into the image", "[revolved][flux]") {
    // Oracle: on the axis nothing points sideways, so that what does averages to nothing and the
    // normal of a dome is upright. Source: symmetry (definition).
    // Tolerance: the element beside the axis lies 0.025 cells off, of a window of 5 cells: 2 % of
    // what points sideways, 0.3 degrees; images that are not turned over must fail.
    const Domain d = tests::round_cell(24);
    const Surface s = domed_hole(d, 0.7, 20, 0.05);
    const ArcAverage average = arc_average(d, s);
    const std::vector<double> ones(s.size(), 1.0);
    CHECK(std::fabs(average.of_sideways(ones, 0)) < 0.02);
    CHECK(average.of(ones, 0) == Approx(1).epsilon(1e-12));
    ArcAverage unturned = average;
    for (ArcAverage::Part& part : unturned.parts)
        part.image = 0;
    const auto normals = averaged_normals(s, average), others = averaged_normals(s, unturned);
    const auto turn = [&](const Vec3& a, const Vec3& b) {
        return std::acos(std::min(1.0, a.dot(b)));
    };
    CHECK(turn(normals[0], s.normal[0]) < 0.3 * degree);
    CHECK(turn(others[0], s.normal[0]) > 2 * degree);
}

TEST_CASE("rates of an image count at the angle turned over", "[revolved][direct]") {
    // Oracle: the weighted sum of what the ions that arrive bring to either normal. Source:
    // definition. Tolerance: 1e-4 of the largest (tables over cosines), at the angles of the
    // tables; at angles that are not turned over it must fail.
    const Domain d = tests::round_cell(16);
    const Surface s = domed_hole(d, 0.5, 12, 1);
    const YieldFunction grazing{ConstantLaw{1.0}, PlateauCosine{45}, 1.0};
    const OneIon one(d, s, IonDistribution::thermal_fall(20, 2, 0.5), 1, grazing);
    const DirectIons& ions = one.ions;
    const ArcAverage& average = *ions.average();
    double fault = 0;
    for (int e = 0; s.centre[e].x < 3; ++e) {
        CAPTURE(e);
        const auto expected = [&](double psi, bool turns) {
            double sum = 0;
            for (int i = average.first[e]; i < average.first[e + 1]; ++i) {
                const ArcAverage::Part& part = average.parts[i];
                const double seen = turns && part.image ? -psi : psi;
                sum += part.weight * brought(ions, grazing, part.element, seen);
            }
            return sum;
        };
        for (std::size_t k = 0; k < one.ions.rate_angles().size(); k += 5) {
            const double psi = one.ions.rate_angles()[k];
            CAPTURE(psi);
            CHECK(std::fabs(one.ions.tally_at(0, e, psi) - expected(psi, true)) < 1e-4);
            fault = std::max(fault, std::fabs(expected(psi, false) - expected(psi, true)));
        }
        const double own = std::atan2(ions.normal()[e].x, ions.normal()[e].z);
        CHECK(one.ions.tally(0, e) == Approx(one.ions.tally_at(0, e, own)).epsilon(1e-6));
    }
    CHECK(fault > 1e-2);
}

TEST_CASE("a tip on the axis or on a mirror side ends an average", "[revolved][flux]") {
    // Oracle: faces that lean by more than half the angle of a corner (15 degrees, and in revolved
    // 22.5) meet their images in one, which no average crosses. Source: definition.
    // Tolerance: none; faces that lean less must be averaged with their images.
    const auto images = [](geometry::Symmetry symmetry, double lean) {
        Domain d;
        d.symmetry = symmetry;
        d.cells_x = 12;
        d.cells_y = symmetry == geometry::Symmetry::full ? 6 : 1;
        const auto at = [&](int i, double y) {
            return Vec3(d.x_min() + i, y, -i * std::tan(lean * degree));
        };
        Surface s;
        if (symmetry == geometry::Symmetry::full) {
            s = tests::lattice(d.cells_x, d.cells_y,
                               [&](int i, int j) { return at(i, d.y_min() + j); });
        } else {
            s = tests::polyline(d, {at(0, 0), at(12, 0)}, 1.2 / std::cos(lean * degree));
            if (d.revolved()) tests::revolve(s);
        }
        const ArcAverage average = arc_average(d, s);
        double sum = 0;
        for (int i = average.first[0]; i < average.first[1]; ++i)
            if (average.parts[i].image & along_x) sum += average.parts[i].weight;
        return sum;
    };
    using geometry::Symmetry;
    CHECK(images(Symmetry::extruded, 16) == 0);
    CHECK(images(Symmetry::full, 16) == 0);
    CHECK(images(Symmetry::revolved, 24) == 0);
    CHECK(images(Symmetry::extruded, 14) > 0.2);
    CHECK(images(Symmetry::full, 14) > 0.2);
    CHECK(images(Symmetry::revolved, 9) > 0.1);
}
