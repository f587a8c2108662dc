// SPDX-License-Identifier: Apache-2.0
#include "fluxes/sky.hpp"

#include "geometry/check.hpp"

#include <algorithm>
#include <array>
#include <cmath>

namespace rille::fluxes {
namespace {

constexpr double pi = 3.14159265358979323846;
constexpr int block_length = 16;

} // namespace

/// Follows vertices seen from one point and keeps the direction of the largest unwrapped angle,
/// where angles are measured from +z towards +x. No trigonometry on the way: `half_turns_` is how
/// many whole half turns the current vertex lies behind the best direction, which changes by one
/// whenever the path crosses the line through the best direction.
class Sky::Walk {
public:
    /// scale: 1, or -1 to look at the mirror image in x.
    Walk(const Point& eye, double scale, const Point& start, double start_angle)
        : eye_(eye), scale_(scale), best_{start.x + 0.0, start.z}, current_(best_),
          turns_(static_cast<int>(
              std::lround((start_angle - std::atan2(best_.x, best_.z)) / (2 * pi)))) {}

    double angle() const { return std::atan2(best_.x, best_.z) + 2 * pi * turns_; }

    /// Vertices first, first + step, ... up to but without last, at x -> offset + factor x.
    void follow(const Sky& sky, int first, int last, int step, double offset, double factor) {
        const double a = scale_ * (offset - eye_.x), f = scale_ * factor;
        int i = first;
        while (i != last) {
            const int block = i / block_length;
            const bool at_edge =
                step > 0 ? i % block_length == 0 : i % block_length == block_length - 1;
            if (at_edge && (last - i) * step >= block_length && half_turns_ == 0 &&
                behind(sky.boxes_[block], a, f)) {
                i += step * (block_length - 1);
                const Point& p = sky.path_[i];
                current_ = {a + f * p.x, p.z - eye_.z};
            } else {
                const Point& p = sky.path_[i];
                go_to({a + f * p.x, p.z - eye_.z});
            }
            i += step;
        }
    }

private:
    /// > 0 if q lies ahead of p by less than half a turn.
    static double cross(const Point& p, const Point& q) { return p.z * q.x - p.x * q.z; }

    /// Whether the box lies wholly within the half turn behind the best direction.
    bool behind(const Box& box, double a, double f) const {
        const double xa = a + f * box.x0, xb = a + f * box.x1;
        const double x = best_.z > 0 ? std::max(xa, xb) : std::min(xa, xb);
        const double z = (best_.x > 0 ? box.z0 : box.z1) - eye_.z;
        return best_.z * x - best_.x * z <= 0;
    }

    void go_to(const Point& to) {
        if (to.x == 0 && to.z == 0) return; // the eye itself
        const double now = cross(best_, to);
        const bool even = half_turns_ % 2 == 0;
        if (even ? now > 0 : now < 0) {
            const double before = cross(best_, current_);
            const double t = before / (before - now);
            const bool forward = best_.x * (current_.x + t * (to.x - current_.x)) +
                                     best_.z * (current_.z + t * (to.z - current_.z)) >
                                 0;
            half_turns_ += even == forward ? -1 : 1;
            if (half_turns_ < 0) {
                if (best_.x >= 0 && to.x < 0) ++turns_;
                best_ = {to.x + 0.0, to.z}; // no negative zero: it would turn pi into -pi
                half_turns_ = 0;
            }
        }
        current_ = to;
    }

    Point eye_;
    double scale_;
    Point best_, current_;
    int half_turns_ = 0;
    int turns_ = 0; ///< whole turns in the unwrapped angle of best_
};

Sky::Sky(const geometry::Domain& domain, const geometry::Surface& surface)
    : sides_(domain.sides), x_min_(domain.x_min()), width_(domain.width_x()),
      position_(surface.size(), -1) {
    RILLE_CHECK(domain.extruded(), "sky intervals exist in extruded symmetry only");
    const int n = static_cast<int>(surface.size());
    int first = -1;
    for (int e = 0; e < n && (first < 0 || surface.previous[first] >= 0); ++e)
        if (surface.chain[e] == 0 && (first < 0 || surface.previous[e] < 0)) first = e;
    double shift = 0;
    for (int e = first; e >= 0 && position_[e] < 0; e = surface.next[e]) {
        const auto a = surface.vertices[surface.corners[e][0]];
        const auto b = surface.vertices[surface.corners[e][1]];
        if (path_.empty())
            path_.push_back({a.x, a.z});
        else // a chain that leaves the period re-enters on the other side
            shift = width_ * std::round((path_.back().x - a.x) / width_);
        position_[e] = static_cast<int>(path_.size()) - 1;
        path_.push_back({b.x + shift, b.z});
    }
    for (std::size_t i = 0; i < path_.size(); i += block_length) {
        Box box{path_[i].x, path_[i].x, path_[i].z, path_[i].z};
        for (std::size_t j = i; j < std::min(path_.size(), i + block_length); ++j) {
            box.x0 = std::min(box.x0, path_[j].x), box.x1 = std::max(box.x1, path_[j].x);
            box.z0 = std::min(box.z0, path_[j].z), box.z1 = std::max(box.z1, path_[j].z);
        }
        boxes_.push_back(box);
    }
}

double Sky::horizon(int element, double t, bool rightwards) const {
    const int k = position_[element], last = static_cast<int>(path_.size()) - 1;
    const Point a = path_[k], b = path_[k + 1];
    const Point eye{a.x + t * (b.x - a.x), a.z + t * (b.z - a.z)};
    const Point along{b.x - a.x, b.z - a.z};
    const double normal = std::atan2(-along.z, along.x); // of the left-hand normal
    const bool mirror = sides_ == geometry::Sides::mirror;
    if (!rightwards) {
        Walk walk(eye, 1, {-along.x, -along.z}, normal - pi / 2);
        walk.follow(*this, k, -1, -1, 0, 1);
        if (mirror)
            walk.follow(*this, 0, last + 1, 1, 2 * x_min_, -1);
        else
            walk.follow(*this, last - 1, k, -1, -width_, 1);
        return walk.angle();
    }
    Walk walk(eye, -1, {-along.x, along.z}, -normal - pi / 2);
    walk.follow(*this, k + 1, last + 1, 1, 0, 1);
    if (mirror)
        walk.follow(*this, last, -1, -1, 2 * (x_min_ + width_), -1);
    else
        walk.follow(*this, 1, k + 1, 1, width_, 1);
    return -walk.angle();
}

SkyInterval Sky::between(int element, double t_left, double t_right) const {
    if (!covers(element)) return {};
    SkyInterval sky;
    sky.left = std::max(horizon(element, t_left, false), -pi / 2);
    if (!(sky.left < pi / 2)) return {};
    sky.right = std::min(horizon(element, t_right, true), pi / 2);
    if (sky.dark()) return {};
    return sky;
}

SkyInterval Sky::at(int element, double t) const {
    return between(element, t, t);
}

SkyInterval Sky::common(int element) const {
    return between(element, 0, 1);
}

double Sky::cosine_flux(int element) const {
    if (!covers(element)) return 0;
    const int k = position_[element];
    const double psi = std::atan2(path_[k].z - path_[k + 1].z, path_[k + 1].x - path_[k].x);
    // Gauss-Legendre, three points: the flux is smooth along a segment but for kinks where the
    // vertex on the horizon changes.
    constexpr std::array<double, 3> node{0.11270166537925831, 0.5, 0.88729833462074169};
    constexpr std::array<double, 3> weight{5.0 / 18, 8.0 / 18, 5.0 / 18};
    double sum = 0;
    for (int i = 0; i < 3; ++i) {
        const SkyInterval sky = at(element, node[i]);
        if (!sky.dark())
            sum += weight[i] * 0.5 * (std::sin(sky.right - psi) - std::sin(sky.left - psi));
    }
    return sum;
}

} // namespace rille::fluxes
