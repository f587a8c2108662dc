// SPDX-License-Identifier: Apache-2.0
#include "geometry/redistance.hpp"

#include "geometry/band_topology.hpp"

#include <algorithm>
#include <cmath>

namespace rille::geometry {

namespace {

constexpr double tolerated_steepness = 0.2;
constexpr double redistance_reach = 1.5; ///< [cells]

/// Whether |grad phi| is off by more than the tolerance whichever one-sided differences are taken.
bool steepness_off(const Band& band, std::size_t c) {
    const double scale = 1 / (band.domain.spacing * band.domain.spacing);
    double least = 0, most = 0;
    for (int axis = 0; axis < 3; ++axis) {
        const int left = band.neighbour[c][2 * axis], right = band.neighbour[c][2 * axis + 1];
        if (left < 0 && right < 0) continue;
        const double back = band.phi[c] - band.phi[left < 0 ? right : left];
        const double ahead = band.phi[c] - band.phi[right < 0 ? left : right];
        least += std::min(back * back, ahead * ahead);
        most += std::max(back * back, ahead * ahead);
    }
    const double low = 1 - tolerated_steepness, high = 1 + tolerated_steepness;
    return least * scale > high * high || most * scale < low * low;
}

/// How far the crossing between a cell and its neighbour moves [cells]; 0 if there is none.
double crossing_shift(double a, double b, double new_a, double new_b) {
    if ((a < 0) == (b < 0)) return 0;
    return std::fabs(a / (a - b) - new_a / (new_a - new_b));
}

} // namespace

double redistance(Band& band, const Surface& surface, const ClosestElements& closest) {
    const double h = band.domain.spacing;
    const std::vector<int> changed = indices_where(band.size(), [&](std::size_t c) {
        return std::fabs(band.phi[c]) < redistance_reach * h && closest.element[c] >= 0 &&
               steepness_off(band, c);
    });
    if (changed.empty()) return 0;

    const RawVector<double> old = band.phi;
    std::vector<char> flag(band.size(), 0);
    for (const int c : changed) {
        flag[c] = 1;
        const Band::Cell& cell = band.cells[c];
        const Vec3 p = band.domain.node(cell.i, cell.j, cell.k);
        // The foot is next to the cell; the element may lie on the other side of the period.
        const int e = closest.element[c];
        Vec3 local = p;
        if (band.domain.sides == Sides::periodic) {
            const double wx = band.domain.width_x(), wy = band.domain.width_y();
            local.x -= wx * std::round((p.x - surface.centre[e].x) / wx);
            if (!band.domain.planar_contour())
                local.y -= wy * std::round((p.y - surface.centre[e].y) / wy);
        }
        const Vec3 foot = exact_nearest_point(surface, band.domain.planar_contour(), e, local);
        const double distance = std::max((local - foot).length(), 1e-12 * h);
        band.phi[c] = old[c] < 0 ? -distance : distance;
    }
    // Put back what moves the contour; what is put back may unsettle a neighbour, so until it
    // holds.
    std::vector<int> back;
    do {
        back.clear();
        for (const int c : changed) {
            const auto moves = [&](int n) {
                return n >= 0 &&
                       crossing_shift(old[c], old[n], band.phi[c], band.phi[n]) > redistance_limit;
            };
            if (flag[c] && std::any_of(band.neighbour[c].begin(), band.neighbour[c].end(), moves))
                back.push_back(c);
        }
        for (const int c : back) {
            band.phi[c] = old[c];
            flag[c] = 0;
        }
    } while (!back.empty());
    double most = 0;
    for (const int c : changed)
        for (const int n : band.neighbour[c])
            if (n >= 0)
                most = std::max(most, crossing_shift(old[c], old[n], band.phi[c], band.phi[n]));
    return most;
}

} // namespace rille::geometry
