// SPDX-License-Identifier: Apache-2.0
#include "geometry/polyline_distance.hpp"

#include "geometry/check.hpp"

#include <algorithm>
#include <cmath>
#include <memory>

namespace rille::geometry {

namespace {

using Point = std::array<double, 2>;

struct Segment {
    Point a, b;
};

double squared_distance(const Segment& s, const Point& p) {
    const double dx = s.b[0] - s.a[0], dz = s.b[1] - s.a[1];
    const double length2 = dx * dx + dz * dz;
    const double along = (p[0] - s.a[0]) * dx + (p[1] - s.a[1]) * dz;
    const double t = length2 > 0 ? std::clamp(along / length2, 0.0, 1.0) : 0;
    const double ox = p[0] - s.a[0] - t * dx, oz = p[1] - s.a[1] - t * dz;
    return ox * ox + oz * oz;
}

class PolylineDistance {
public:
    PolylineDistance(const Domain& domain, const std::vector<Polyline>& lines, double reach)
        : domain_(domain), reach_(reach), x_low_(domain.x_min()),
          x_high_(domain.x_min() + domain.width_x()) {
        RILLE_CHECK(reach > 0, "a reach above 0");
        for (const Polyline& line : lines)
            for (std::size_t i = 0; i + 1 < line.size(); ++i)
                segments_.push_back({line[i], line[i + 1]});
        lay_out_bins();
        for (const Segment& s : segments_)
            add_with_images(s);
        for (int i = 0; i < domain_.cells_x; ++i)
            above_.push_back(crossings(domain_.node(i, 0, 0).x));
    }

    double operator()(const Vec3& at) const {
        const Point p{folded(at.x), at.z};
        const double distance = std::sqrt(std::min(nearest(p), reach_ * reach_));
        return in_gas(p) ? distance : -distance;
    }

private:
    double folded(double x) const {
        if (x >= x_low_ && x <= x_high_) return x;
        const double width = x_high_ - x_low_;
        double u = (x - x_low_) / width;
        if (domain_.sides == Sides::periodic) return x_low_ + width * (u - std::floor(u));
        u = std::fabs(std::remainder(u, 2.0)); // mirrors lie at whole numbers
        return x_low_ + width * u;
    }

    void lay_out_bins() {
        double low = HUGE_VAL, high = -HUGE_VAL;
        for (const Segment& s : segments_)
            for (const Point& p : {s.a, s.b}) {
                low = std::min(low, p[1]);
                high = std::max(high, p[1]);
            }
        z_low_ = low;
        columns_ = static_cast<int>(std::ceil((x_high_ - x_low_) / reach_)) + 4;
        rows_ = segments_.empty() ? 1 : static_cast<int>(std::ceil((high - low) / reach_)) + 4;
        bins_.resize(static_cast<std::size_t>(columns_) * rows_);
    }
    int column(double x) const { return static_cast<int>(std::floor((x - x_low_) / reach_)) + 2; }
    int row(double z) const { return static_cast<int>(std::floor((z - z_low_) / reach_)) + 2; }

    void add_with_images(const Segment& s) {
        add(s);
        for (const double side : {x_low_, x_high_}) {
            Segment image = s;
            for (Point* p : {&image.a, &image.b})
                (*p)[0] = domain_.sides == Sides::mirror
                              ? 2 * side - (*p)[0]
                              : (*p)[0] + (side == x_low_ ? x_low_ - x_high_ : x_high_ - x_low_);
            add(image);
        }
    }
    /// In pieces no longer than the reach, each in the bin of its middle.
    void add(const Segment& s) {
        const double dx = s.b[0] - s.a[0], dz = s.b[1] - s.a[1];
        const int pieces = std::max(1, static_cast<int>(std::ceil(std::hypot(dx, dz) / reach_)));
        for (int n = 0; n < pieces; ++n) {
            const double t = static_cast<double>(n) / pieces, u = (n + 1.0) / pieces;
            const Point middle{s.a[0] + 0.5 * (t + u) * dx, s.a[1] + 0.5 * (t + u) * dz};
            const int i = column(middle[0]), k = row(middle[1]);
            if (i < 0 || i >= columns_ || k < 0 || k >= rows_) continue; // an image out of reach
            const Segment piece{n == 0 ? s.a : Point{s.a[0] + t * dx, s.a[1] + t * dz},
                                n + 1 == pieces ? s.b : Point{s.a[0] + u * dx, s.a[1] + u * dz}};
            bins_[static_cast<std::size_t>(k) * columns_ + i].push_back(piece);
        }
    }

    /// Squared distance to what lies within the reach.
    double nearest(const Point& p) const {
        const int i0 = column(p[0]);
        const double at = std::floor((p[1] - z_low_) / reach_) + 2;
        if (at < -2 || at > rows_ + 2) return HUGE_VAL;
        const int k0 = static_cast<int>(at);
        double best = HUGE_VAL;
        for (int k = std::max(0, k0 - 2); k <= std::min(rows_ - 1, k0 + 2); ++k)
            for (int i = std::max(0, i0 - 2); i <= std::min(columns_ - 1, i0 + 2); ++i)
                for (const Segment& s : bins_[static_cast<std::size_t>(k) * columns_ + i])
                    best = std::min(best, squared_distance(s, p));
        return best;
    }

    /// Heights where the upright line at x meets the lines, ascending.
    std::vector<double> crossings(double x) const {
        std::vector<double> z;
        for (const Segment& s : segments_)
            if ((s.a[0] <= x) != (s.b[0] <= x))
                z.push_back(s.a[1] + (s.b[1] - s.a[1]) * ((x - s.a[0]) / (s.b[0] - s.a[0])));
        std::sort(z.begin(), z.end());
        return z;
    }
    bool in_gas(const Point& p) const {
        const double u = (p[0] - x_low_) / domain_.spacing - 0.5;
        const long i = std::lround(u);
        const bool on_node =
            i >= 0 && i < domain_.cells_x && domain_.node(static_cast<int>(i), 0, 0).x == p[0];
        const std::vector<double> own = on_node ? std::vector<double>() : crossings(p[0]);
        const std::vector<double>& z = on_node ? above_[i] : own;
        return (z.end() - std::upper_bound(z.begin(), z.end(), p[1])) % 2 == 0;
    }

    Domain domain_;
    double reach_, x_low_, x_high_, z_low_ = 0;
    int columns_ = 1, rows_ = 1;
    std::vector<Segment> segments_;
    std::vector<std::vector<Segment>> bins_;
    std::vector<std::vector<double>> above_; ///< crossings of the columns of nodes
};

/// Whether two pieces have a point in common, and where.
bool meet(const Segment& s, const Segment& t, Point& where) {
    const auto side = [](const Segment& of, const Point& p) {
        return (of.b[0] - of.a[0]) * (p[1] - of.a[1]) - (of.b[1] - of.a[1]) * (p[0] - of.a[0]);
    };
    for (const int axis : {0, 1})
        if (std::max(s.a[axis], s.b[axis]) < std::min(t.a[axis], t.b[axis]) ||
            std::max(t.a[axis], t.b[axis]) < std::min(s.a[axis], s.b[axis]))
            return false;
    const double a = side(s, t.a), b = side(s, t.b), c = side(t, s.a), d = side(t, s.b);
    if ((a > 0 && b > 0) || (a < 0 && b < 0) || (c > 0 && d > 0) || (c < 0 && d < 0)) return false;
    const double part = a != b ? a / (a - b) : 0;
    where = {t.a[0] + part * (t.b[0] - t.a[0]), t.a[1] + part * (t.b[1] - t.a[1])};
    return true;
}

} // namespace

std::function<double(const Vec3&)>
polyline_distance(const Domain& domain, const std::vector<Polyline>& lines, double reach) {
    const auto found = std::make_shared<const PolylineDistance>(domain, lines, reach);
    return [found](const Vec3& p) { return (*found)(p); };
}

std::optional<PolylineCrossing> find_crossing(const std::vector<Polyline>& lines) {
    struct Piece {
        std::size_t line, piece;
        Segment s;
        double left, right;
    };
    std::vector<Piece> pieces;
    for (std::size_t l = 0; l < lines.size(); ++l)
        for (std::size_t p = 0; p + 1 < lines[l].size(); ++p) {
            const Segment s{lines[l][p], lines[l][p + 1]};
            pieces.push_back({l, p, s, std::min(s.a[0], s.b[0]), std::max(s.a[0], s.b[0])});
        }
    std::optional<PolylineCrossing> first;
    const auto follow = [&](const Piece& a, const Piece& b) {
        if (a.line != b.line) return false;
        const Polyline& line = lines[a.line];
        return b.piece - a.piece <= 1 ||
               (a.piece == 0 && b.piece + 2 == line.size() && line.front() == line.back());
    };
    for (std::size_t i = 0; i < pieces.size() && !first; ++i)
        for (std::size_t j = i + 1; j < pieces.size() && !first; ++j) {
            const Piece &a = pieces[i], &b = pieces[j];
            Point where;
            if (a.left > b.right || b.left > a.right || follow(a, b) || !meet(a.s, b.s, where))
                continue;
            first = PolylineCrossing{a.line, a.piece, b.line, b.piece, where[0], where[1]};
        }
    return first;
}

} // namespace rille::geometry
