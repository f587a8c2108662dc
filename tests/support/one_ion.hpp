// SPDX-License-Identifier: Apache-2.0
// What the tests of direct and reflected ions share: one ion species, a yield of one, trenches with
// leaning walls, averages over a part of the surface.
#pragma once

#include "fluxes/direct_ions.hpp"
#include "tests/support/shapes.hpp"
#include "tests/support/statistics.hpp"
#include "tests/support/tabulated_ions.hpp"

#include <cmath>
#include <vector>

namespace rille::tests {

constexpr double pi = 3.14159265358979323846;
constexpr double degree = pi / 180;

inline const fluxes::YieldFunction per_ion{fluxes::ConstantLaw{1.0}, fluxes::FlatAngle{}, 1.0};

/// One ion species of 40 amu gathered on a surface; tally 0 is `yield`.
struct OneIon {
    geometry::RayCaster caster;
    TabulatedIons ions;
    OneIon(const Domain& d, const Surface& s, const fluxes::IonDistribution& law, double flux = 1,
           const fluxes::YieldFunction& yield = per_ion,
           const fluxes::DirectIons::Options& options = {})
        : caster(d, s, 10), ions(d, s, caster, {{"X+", 40, flux, law}}, {{0, yield}}, options) {}
};

/// Trench whose walls lean outwards by `tilt` [rad], the opening wider than the floor.
inline Surface leaning_trench(const Domain& d, double floor, double depth, double tilt,
                              double length) {
    const double side = 0.5 * d.width_x(), top = 0.5 * floor + depth * std::tan(tilt);
    return polyline(d,
                    {{-side, 0, 0},
                     {-top, 0, 0},
                     {-0.5 * floor, 0, -depth},
                     {0.5 * floor, 0, -depth},
                     {top, 0, 0},
                     {side, 0, 0}},
                    length);
}

/// Average by area over the elements whose centres satisfy a condition.
template <class Value, class Where>
double area_average(const Surface& s, Value value, Where where) {
    double sum = 0, area = 0;
    for (std::size_t e = 0; e < s.size(); ++e)
        if (where(s.centre[e])) {
            sum += value(static_cast<int>(e)) * s.area[e];
            area += s.area[e];
        }
    return sum / area;
}

/// The same by each of the 8 batches: their mean and its standard error.
template <class Value, class Where>
Mean batch_average(const Surface& s, Value value, Where where) {
    std::vector<double> batch;
    for (int b = 0; b < 8; ++b)
        batch.push_back(area_average(
            s, [&](int e) { return value(b, e); }, where));
    return Mean(batch);
}

} // namespace rille::tests
