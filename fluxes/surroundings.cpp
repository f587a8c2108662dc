// SPDX-License-Identifier: Apache-2.0
#include "fluxes/surroundings.hpp"

#include <tbb/blocked_range.h>
#include <tbb/parallel_for.h>

#include <algorithm>
#include <cmath>
#include <numeric>

namespace rille::fluxes {
namespace {

using geometry::Domain;
using geometry::Surface;
using geometry::Vec3;

/// An element as it lies some periods further on along x and y. At mirror sides an odd number of
/// them is an image.
struct Copy {
    int element;
    std::int8_t x, y;

    bool operator==(const Copy& o) const { return element == o.element && x == o.x && y == o.y; }
    bool own_period() const { return x == 0 && y == 0; }
    std::uint8_t image() const { return (x & 1 ? along_x : 0) | (y & 1 ? along_y : 0); }
};

/// Lists of unequal length, one behind the other: [first[i], first[i + 1]).
struct Lists {
    std::vector<int> first;
    std::vector<Copy> value;
};

/// By how many periods what meets a place from the other side of its mirror lies further on.
int beyond(double place, double low, double high, double tolerance) {
    return place < low + tolerance ? -1 : place > high - tolerance ? 1 : 0;
}

/// The elements at each vertex, and their images where it lies on a mirror side.
Lists elements_at_vertices(const Domain& domain, const Surface& surface) {
    const bool mirrors = domain.sides == geometry::Sides::mirror;
    const double tolerance = 1e-6 * domain.spacing;
    const auto over_corners = [&](const auto& work) {
        for (int e = 0; e < static_cast<int>(surface.size()); ++e)
            for (int i = 0; i < 4; ++i) {
                const int vertex = surface.corners[e][i];
                if (i == 3 && vertex == surface.corners[e][2]) continue;
                const Vec3& p = surface.vertices[vertex];
                const int x = mirrors ? beyond(p.x, domain.x_min(), domain.x_max(), tolerance) : 0;
                const int y = mirrors ? beyond(p.y, domain.y_min(), -domain.y_min(), tolerance) : 0;
                for (int images = 0; images < 4; ++images) {
                    if (((images & 1) && x == 0) || ((images & 2) && y == 0)) continue;
                    work(vertex, Copy{e, static_cast<std::int8_t>(images & 1 ? x : 0),
                                      static_cast<std::int8_t>(images & 2 ? y : 0)});
                }
            }
    };
    Lists at;
    at.first.assign(surface.vertices.size() + 1, 0);
    over_corners([&](int vertex, const Copy&) { ++at.first[vertex + 1]; });
    std::partial_sum(at.first.begin(), at.first.end(), at.first.begin());
    at.value.resize(at.first.back());
    std::vector<int> next = at.first;
    over_corners([&](int vertex, const Copy& copy) { at.value[next[vertex]++] = copy; });
    return at;
}

/// Seen from a copy, where sides of images lie the other way round.
Copy seen_from(const Copy& from, const Copy& at) {
    const auto further = [](int periods, int step) {
        return static_cast<std::int8_t>(periods + (periods & 1 ? -step : step));
    };
    return {at.element, further(from.x, at.x), further(from.y, at.y)};
}

bool corner_between(const Surface& surface, int e, const Copy& f) {
    const Vec3 normal =
        f.own_period() ? surface.normal[f.element] : mirrored(surface.normal[f.element], f.image());
    return surface.normal[e].dot(normal) < std::cos(corner_angle);
}

/// Calls work(e, the element and those that share a corner with it, twice over) for every element.
template <class Work>
void over_surroundings(const Surface& surface, const Lists& at_vertex, const Work& work) {
    const int count = static_cast<int>(surface.size());
    tbb::parallel_for(tbb::blocked_range<int>(0, count, 64), [&](const auto& range) {
        std::vector<Copy> found;
        for (int e = range.begin(); e != range.end(); ++e) {
            found.assign(1, {e, 0, 0});
            std::size_t begin = 0;
            for (int ringed = 0; ringed < 2; ++ringed) {
                const std::size_t end = found.size();
                for (std::size_t k = begin; k < end; ++k) {
                    const Copy from = found[k];
                    for (const int corner : surface.corners[from.element])
                        for (int i = at_vertex.first[corner]; i < at_vertex.first[corner + 1];
                             ++i) {
                            const Copy f = seen_from(from, at_vertex.value[i]);
                            if (std::find(found.begin(), found.end(), f) == found.end() &&
                                !corner_between(surface, e, f))
                                found.push_back(f);
                        }
                }
                begin = end;
            }
            work(e, found);
        }
    });
}

} // namespace

/// Weights a_f / max(S_e, S_f), S the area around: times a_e they are the same both ways, so that
/// averages keep sums over the surface. The rest stays with the element.
ArcAverage average_over_surroundings(const Domain& domain, const Surface& surface) {
    const Lists at_vertex = elements_at_vertices(domain, surface);
    ArcAverage average;
    average.first.assign(surface.size() + 1, 0);
    std::vector<double> area(surface.size(), 0.0);
    over_surroundings(surface, at_vertex, [&](int e, const std::vector<Copy>& found) {
        average.first[e + 1] = static_cast<int>(found.size());
        for (const Copy& f : found)
            area[e] += surface.area[f.element];
    });
    std::partial_sum(average.first.begin(), average.first.end(), average.first.begin());
    average.parts.resize(average.first.back());
    over_surroundings(surface, at_vertex, [&](int e, const std::vector<Copy>& found) {
        ArcAverage::Part* parts = average.parts.data() + average.first[e];
        parts[0] = {e, 0, 1.0};
        for (std::size_t i = 1; i < found.size(); ++i) {
            const int f = found[i].element;
            const double widest = std::max(area[e], area[f]);
            const double weight = widest > 0 ? surface.area[f] / widest : 0.0;
            parts[i] = {f, found[i].image(), weight};
            parts[0].weight -= weight;
        }
    });
    return average;
}

} // namespace rille::fluxes
