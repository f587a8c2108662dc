// SPDX-License-Identifier: Apache-2.0
#include "engine/section.hpp"

#include "geometry/check.hpp"

#include <algorithm>
#include <cmath>
#include <limits>
#include <unordered_map>

namespace rille::engine {
namespace {

using geometry::Surface;
using geometry::Vec3;

std::array<double, 2> xz(const Vec3& p) {
    return {p.x, p.z};
}

/// Does element e go on where its predecessor ends (and not on the other side of the period)?
bool joined(const Surface& s, int e) {
    const int before = s.previous[e];
    if (before < 0) return false;
    const Vec3 gap = s.vertices[s.corners[e][0]] - s.vertices[s.corners[before][1]];
    return gap.length() <= 1e-9 * (1 + s.length(e));
}

SectionLine walk(const Surface& s, int start, std::vector<char>& seen) {
    SectionLine line;
    line.points.push_back(xz(s.vertices[s.corners[start][0]]));
    int e = start;
    while (true) {
        seen[e] = 1;
        line.element.push_back(e);
        line.points.push_back(xz(s.vertices[s.corners[e][1]]));
        const int after = s.next[e];
        line.closed = after == start && joined(s, start);
        if (after < 0 || seen[after] || !joined(s, after)) return line;
        e = after;
    }
}

Section chains(const Surface& s) {
    Section section;
    const int n = static_cast<int>(s.size());
    std::vector<char> seen(n, 0);
    for (int e = 0; e < n; ++e)
        if (!joined(s, e)) section.push_back(walk(s, e, seen));
    for (int e = 0; e < n; ++e)
        if (!seen[e]) section.push_back(walk(s, e, seen));
    return section;
}

/// The line's image about x = 0, walked with the gas on the same side.
SectionLine image_of(const SectionLine& line) {
    SectionLine image;
    for (auto p = line.points.rbegin(); p != line.points.rend(); ++p)
        image.points.push_back({-(*p)[0], (*p)[1]});
    image.element.assign(line.element.rbegin(), line.element.rend());
    image.closed = line.closed;
    image.images = image.element.size();
    return image;
}

/// The section through the axis of revolution. A line that starts on the axis goes on from its
/// image, one that starts and ends there closes with it.
Section both_halves(const Section& half) {
    Section whole;
    for (const SectionLine& line : half) {
        SectionLine image = image_of(line);
        const bool starts = line.points.front()[0] == 0, ends = line.points.back()[0] == 0;
        if (line.closed || !starts) { // apart from the axis, or the two walked towards it
            whole.push_back(std::move(image));
            whole.push_back(line);
            continue;
        }
        image.points.insert(image.points.end(), line.points.begin() + 1, line.points.end());
        image.element.insert(image.element.end(), line.element.begin(), line.element.end());
        image.closed = ends;
        whole.push_back(std::move(image));
    }
    return whole;
}

/// Cuts triangles by a plane. Cut points lie on mesh edges and are known by the edge, so pieces
/// join exactly; a vertex on the plane counts as above it.
class Cutter {
public:
    Cutter(const Surface& s, int axis, double level, int first, int second)
        : s_(s), axis_(axis), level_(level), first_(first), second_(second) {}

    Section cut() {
        for (std::size_t e = 0; e < s_.size(); ++e) {
            const auto& c = s_.corners[e];
            cut_triangle(static_cast<int>(e), c[0], c[1], c[2]);
            if (c[3] != c[2]) cut_triangle(static_cast<int>(e), c[0], c[2], c[3]);
        }
        Section section;
        for (std::size_t p = 0; p < links_.size(); ++p)
            if (links_[p].size() == 1 && !done(p)) section.push_back(follow(p));
        for (std::size_t p = 0; p < links_.size(); ++p)
            if (!done(p)) section.push_back(follow(p));
        return section;
    }

private:
    struct Link {
        std::size_t other;
        int element;
        bool used = false;
    };

    bool above(int v) const { return s_.vertices[v][axis_] >= level_; }
    bool done(std::size_t p) const {
        return std::all_of(links_[p].begin(), links_[p].end(),
                           [](const Link& l) { return l.used; });
    }

    std::size_t point(int a, int b) {
        if (a > b) std::swap(a, b);
        const std::uint64_t key = (static_cast<std::uint64_t>(a) << 32) | static_cast<unsigned>(b);
        const auto [at, fresh] = index_.try_emplace(key, points_.size());
        if (fresh) {
            const Vec3 p = s_.vertices[a], q = s_.vertices[b];
            const double t = (level_ - p[axis_]) / (q[axis_] - p[axis_]);
            const Vec3 cut = p + (q - p) * t;
            points_.push_back({cut[first_], cut[second_]});
            links_.emplace_back();
        }
        return at->second;
    }

    void cut_triangle(int element, int a, int b, int c) {
        std::vector<std::size_t> ends;
        for (const auto& [p, q] : {std::pair(a, b), std::pair(b, c), std::pair(c, a)})
            if (above(p) != above(q)) ends.push_back(point(p, q));
        if (ends.size() != 2) return;
        links_[ends[0]].push_back({ends[1], element});
        links_[ends[1]].push_back({ends[0], element});
    }

    SectionLine follow(std::size_t start) {
        SectionLine line;
        line.points.push_back(points_[start]);
        std::size_t at = start;
        while (true) {
            const auto link = std::find_if(links_[at].begin(), links_[at].end(),
                                           [](const Link& l) { return !l.used; });
            if (link == links_[at].end()) break;
            link->used = true;
            const std::size_t to = link->other;
            for (Link& back : links_[to])
                if (back.other == at && !back.used && back.element == link->element) {
                    back.used = true;
                    break;
                }
            line.element.push_back(link->element);
            line.points.push_back(points_[to]);
            at = to;
        }
        line.closed = at == start && line.points.size() > 2;
        return line;
    }

    const Surface& s_;
    int axis_;
    double level_;
    int first_, second_;
    std::unordered_map<std::uint64_t, std::size_t> index_;
    std::vector<std::array<double, 2>> points_;
    std::vector<std::vector<Link>> links_;
};

} // namespace

Section vertical_section(const geometry::Domain& domain, const Surface& s, double y) {
    if (domain.revolved()) return both_halves(chains(s));
    if (domain.extruded()) return chains(s);
    return Cutter(s, 1, y, 0, 2).cut();
}

geometry::Vec3 normal_of(const Surface& s, const SectionLine& line, std::size_t i) {
    geometry::Vec3 n = s.normal[line.element[i]];
    if (i < line.images) n.x = -n.x;
    return n;
}

Section horizontal_section(const Surface& s, double z) {
    return Cutter(s, 2, z, 0, 1).cut();
}

bool walls_at(const Section& section, double height, double x, double& left, double& right) {
    const double none = std::numeric_limits<double>::infinity();
    left = -none;
    right = none;
    for (const SectionLine& line : section)
        for (std::size_t i = 0; i + 1 < line.points.size(); ++i) {
            const auto &p = line.points[i], &q = line.points[i + 1];
            if ((p[1] >= height) == (q[1] >= height)) continue;
            const double cut = p[0] + (q[0] - p[0]) * (height - p[1]) / (q[1] - p[1]);
            if (cut <= x)
                left = std::max(left, cut);
            else
                right = std::min(right, cut);
        }
    return std::isfinite(left) && std::isfinite(right);
}

} // namespace rille::engine
