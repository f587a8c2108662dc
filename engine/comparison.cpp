// SPDX-License-Identifier: Apache-2.0
#include "engine/comparison.hpp"

#include "engine/case.hpp"
#include "engine/metrics.hpp"
#include "engine/section.hpp"
#include "geometry/metrology.hpp"

#include <algorithm>
#include <cmath>
#include <limits>

namespace rille::engine {
namespace {

using geometry::Measured;
using geometry::Surface;
using Point = std::array<double, 2>;

constexpr std::size_t most_heights = 200, most_stations = 4000;

/// Points at even distances along a line of points, its ends included.
std::vector<Point> stations(const std::vector<Point>& line, double step) {
    double length = 0;
    for (std::size_t i = 1; i < line.size(); ++i)
        length += std::hypot(line[i][0] - line[i - 1][0], line[i][1] - line[i - 1][1]);
    const auto count = std::clamp<std::size_t>(static_cast<std::size_t>(std::ceil(length / step)),
                                               1, most_stations);
    std::vector<Point> even;
    double passed = 0;
    std::size_t next = 0;
    for (std::size_t i = 1; i < line.size(); ++i) {
        const Point a = line[i - 1], b = line[i];
        const double part = std::hypot(b[0] - a[0], b[1] - a[1]);
        for (; next <= count; ++next) {
            const double due = length * static_cast<double>(next) / static_cast<double>(count);
            if (due > passed + part && i + 1 < line.size()) break;
            const double t = part > 0 ? std::min((due - passed) / part, 1.0) : 0;
            even.push_back({a[0] + t * (b[0] - a[0]), a[1] + t * (b[1] - a[1])});
        }
        passed += part;
    }
    return even;
}

struct Nearest {
    double distance = std::numeric_limits<double>::infinity();
    double slope = 0; ///< d(distance)/d(outward displacement of the element)
    int element = -1;
};

Nearest nearest(const Section& section, const Surface& surface, const Point& p) {
    Nearest best;
    for (const SectionLine& line : section)
        for (std::size_t i = 0; i + 1 < line.points.size(); ++i) {
            const Point &a = line.points[i], &b = line.points[i + 1];
            const double dx = b[0] - a[0], dz = b[1] - a[1], square = dx * dx + dz * dz;
            const double along = (p[0] - a[0]) * dx + (p[1] - a[1]) * dz;
            const double t = square > 0 ? std::clamp(along / square, 0.0, 1.0) : 0;
            const double rx = p[0] - a[0] - t * dx, rz = p[1] - a[1] - t * dz;
            const double distance = std::hypot(rx, rz);
            if (distance >= best.distance) continue;
            best.distance = distance;
            best.element = line.element[i];
            const geometry::Vec3 n = normal_of(surface, line, i);
            const double in_plane = std::hypot(n.x, n.z);
            const bool in_gas = rx * n.x + rz * n.z >= 0;
            best.slope = in_plane > 1e-6 ? (in_gas ? -1 : 1) / in_plane : 0;
        }
    return best;
}

void measure_distances(const std::vector<Point>& contour, const Section& section,
                       const SurfaceState& state, double step, ContourComparison& result) {
    const std::vector<Point> even = stations(contour, step);
    const auto count = static_cast<double>(even.size());
    Measured rms;
    double squares = 0;
    for (const Point& p : even) {
        const Nearest found = nearest(section, state.surface, p);
        if (found.element < 0) return;
        squares += found.distance * found.distance / count;
        rms.elements.emplace_back(found.element, found.distance * found.slope / count);
        if (found.distance <= result.largest_nm) continue;
        result.largest_nm = found.distance;
        result.largest_at_z_nm = p[1];
    }
    rms.value = std::sqrt(squares);
    for (auto& weight : rms.elements)
        weight.second = rms.value > 0 ? weight.second / rms.value : 0;
    result.rms_nm = rms.value;
    result.rms_error_nm = sampling_error(rms, state.displacement);
}

std::optional<WallsAt::Walls> walls(const Section& section, double z, double axis) {
    WallsAt::Walls found;
    if (!walls_at(section, z, axis, found.left_nm, found.right_nm)) return {};
    return found;
}

/// Sampling error of the width between the walls that the section has at a height.
double width_error(const Section& section, const SurfaceState& state, double z,
                   const WallsAt::Walls& found) {
    Measured width;
    for (const SectionLine& line : section)
        for (std::size_t i = 0; i + 1 < line.points.size(); ++i) {
            const Point &a = line.points[i], &b = line.points[i + 1];
            if ((a[1] >= z) == (b[1] >= z)) continue;
            const double x = a[0] + (b[0] - a[0]) * (z - a[1]) / (b[1] - a[1]);
            const double slant = normal_of(state.surface, line, i).x;
            if (std::abs(slant) < 1e-6) continue;
            if (x == found.left_nm) width.elements.emplace_back(line.element[i], -1 / slant);
            if (x == found.right_nm) width.elements.emplace_back(line.element[i], 1 / slant);
        }
    return sampling_error(width, state.displacement);
}

void measure_walls(const std::vector<Point>& contour, const Section& section,
                   const SurfaceState& state, double axis, double step, ContourComparison& result) {
    const Section measured = {{contour, std::vector<int>(contour.size() - 1, 0), false}};
    const auto [low, high] = std::minmax_element(
        contour.begin(), contour.end(), [](const Point& a, const Point& b) { return a[1] < b[1]; });
    const double extent = (*high)[1] - (*low)[1];
    const auto count =
        std::clamp<std::size_t>(static_cast<std::size_t>(extent / step), 1, most_heights);
    for (std::size_t i = 0; i < count; ++i) {
        WallsAt row;
        row.z_nm = (*high)[1] - extent * (static_cast<double>(i) + 0.5) / count;
        row.measured = walls(measured, row.z_nm, axis);
        row.predicted = walls(section, row.z_nm, axis);
        if (!row.measured && !row.predicted) continue;
        if (row.predicted)
            row.width_error_nm = width_error(section, state, row.z_nm, *row.predicted);
        result.walls.push_back(row);
    }
}

ContourComparison compare_contour(const Case& c, const SurfaceState& state,
                                  const MeasuredContour& contour, double cut) {
    ContourComparison result;
    result.feature = contour.feature;
    result.cut_nm = cut;
    const auto opening =
        std::find_if(c.mask.openings.begin(), c.mask.openings.end(),
                     [&](const geometry::Opening& o) { return o.name == contour.feature; });
    const double y = c.domain.planar_contour() ? 0 : opening->centre_y + cut;
    const Section section = vertical_section(c.domain, state.surface, y);
    const double step = 0.5 * c.domain.spacing;
    measure_distances(contour.points, section, state, step, result);
    measure_walls(contour.points, section, state, opening->centre_x, c.domain.spacing, result);
    return result;
}

CdComparison compare_cd(const Case& c, const SurfaceState& state, const MeasuredCd& cd) {
    CdComparison result;
    result.feature = cd.feature;
    result.place = cd.place;
    result.z_nm = c.cd_places.at(cd.place).z;
    result.mean_nm = cd.mean_nm;
    result.mean_error_nm = cd.error();
    result.sites = cd.sites;
    const std::vector<geometry::FeatureSite> sites = feature_sites(c);
    for (std::size_t f = 0; f < sites.size(); ++f) {
        if (c.mask.openings[f].name != cd.feature) continue;
        const auto width = geometry::cd_at(c.domain, state.surface, sites[f], result.z_nm);
        if (!width) continue;
        result.predicted_nm = width->value;
        result.predicted_error_nm = sampling_error(*width, state.displacement);
    }
    return result;
}

} // namespace

Comparison compare_measured(const Case& c, const SurfaceState& state) {
    Comparison result;
    if (const auto& contour = c.measured.contour) {
        result.contours.push_back(compare_contour(c, state, *contour, contour->cut_least));
        if (contour->cut_most > contour->cut_least)
            result.contours.push_back(compare_contour(c, state, *contour, contour->cut_most));
    }
    for (const MeasuredCd& cd : c.measured.cds)
        result.cds.push_back(compare_cd(c, state, cd));
    return result;
}

} // namespace rille::engine
