// SPDX-License-Identifier: Apache-2.0
#include "geometry/bore_rims.hpp"

#include <algorithm>
#include <limits>

namespace rille::geometry {

namespace {

constexpr std::size_t most_rims = 24; ///< more take longer than a search

/// Lower convex hull of r over z, the highest point first.
class Hull {
public:
    struct Point {
        double z, r;
    };
    const std::vector<Point>& points() const { return points_; }

    void add(const Point& p) {
        auto at = std::find_if(points_.rbegin(), points_.rend(), [&](const Point& q) {
                      return q.z >= p.z;
                  }).base(); // behind the last that is as high
        if (at != points_.begin() && (at - 1)->z == p.z) {
            if ((at - 1)->r <= p.r) return;
            at = points_.erase(at - 1);
        }
        if (at != points_.begin() && at != points_.end() && !below(p, *(at - 1), *at)) return;
        at = points_.insert(at, p);
        while (at - points_.begin() >= 2 && !below(*(at - 1), *(at - 2), p))
            at = points_.erase(at - 1);
        while (points_.end() - at >= 3 && !below(*(at + 1), p, *(at + 2)))
            points_.erase(at + 1);
    }

private:
    /// Whether p, between two others in height, lies nearer to the axis than the line through them.
    static bool below(const Point& p, const Point& high, const Point& low) {
        return (p.r - low.r) * (high.z - low.z) < (high.r - low.r) * (p.z - low.z);
    }
    std::vector<Point> points_;
};

} // namespace

BoreRims::BoreRims(const Surface& s, double radius) : first_(s.size() + 1, 0) {
    const int size = static_cast<int>(s.size());
    // Pieces that float in the gas could stand in the way.
    if (std::any_of(s.chain.begin(), s.chain.end(), [](int c) { return c != 0; })) return;
    const auto end = [&](int e, int k) { return s.vertices[s.corners[e][k]]; };
    std::vector<char> serves(size, 0);
    double highest = -std::numeric_limits<double>::infinity(), lowest = -highest;
    for (int e = 0; e < size; ++e) {
        highest = std::max(highest, end(e, 0).z);
        serves[e] = highest <= end(e, 0).z && end(e, 1).z > end(e, 0).z;
    }
    Hull hull;
    std::vector<std::vector<Rim>> rims(size);
    for (int e = size - 1; e >= 0; --e) {
        const Vec3 last = end(e, 1);
        lowest = std::min(lowest, last.z);
        if (last.x < radius * (1 - 1e-12)) hull.add({last.z, last.x});
        if (!serves[e] || lowest < last.z || hull.points().size() > most_rims) continue;
        for (const Hull::Point& p : hull.points())
            rims[e].push_back({p.z, p.r * p.r});
    }
    for (int e = 0; e < size; ++e) {
        rims_.insert(rims_.end(), rims[e].begin(), rims[e].end());
        first_[e + 1] = static_cast<int>(rims_.size());
    }
}

} // namespace rille::geometry
