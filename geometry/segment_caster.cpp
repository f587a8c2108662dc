// SPDX-License-Identifier: Apache-2.0
#include "geometry/segment_caster.hpp"

#include "geometry/check.hpp"

#include <algorithm>
#include <cmath>
#include <limits>

namespace rille::geometry {

namespace {

constexpr double far_away = 1e300;
// A ray below the highest point of the surface meets the period's highest point, or what lies in
// front of it, within two images; more means that something is broken.
constexpr int most_folds = 16;

double safe_inverse(double v) {
    if (std::fabs(v) > 1.0 / far_away) return 1.0 / v;
    return std::signbit(v) ? -far_away : far_away;
}

} // namespace

struct SegmentCaster::Ray {
    double ox, oz;         ///< origin in the frame of the present image
    double dx, dz;         ///< unit in the plane
    double y, dy;          ///< out of plane: y and slope dy per in-plane length
    double per_length = 1; ///< path length per in-plane length
    double inverse_x, inverse_z;
    double positive; ///< a vertex with side(v) >= positive lies on the left
    double t = 0;    ///< in-plane length so far
    int ix = 0, iz = 0;
    int from = -1;
    int folds = 0;
    bool flipped = false; ///< x runs backwards in this image
    Vec3 direction;

    // The sense of travel also for a ray along z or x (a zero keeps its sign bit).
    bool rightwards() const { return inverse_x > 0; }
    bool upwards() const { return inverse_z > 0; }
    void flip() {
        dx = -dx;
        inverse_x = -inverse_x;
        flipped = !flipped;
        // A vertex exactly on the ray keeps its side when the picture is mirrored.
        positive = flipped ? std::numeric_limits<double>::denorm_min() : 0.0;
    }
};

struct SegmentCaster::Best {
    double t = far_away;
    double share = 0; ///< of the way from a to b
    int element = -1;
};

SegmentCaster::SegmentCaster(const Domain& domain, const Surface& surface, double z_open)
    : domain_(domain), z_open_(z_open), width_(domain.width_x()), x_min_(domain.x_min()),
      slack_(1e-9 * domain.spacing) {
    RILLE_CHECK(surface.size() > 0, "empty surface");
    ends_.reserve(surface.size());
    for (const auto& c : surface.corners) {
        const Vec3 &a = surface.vertices[c[0]], &b = surface.vertices[c[1]];
        ends_.push_back({a.x, a.z, b.x, b.z});
    }
    joined_.assign(surface.size(), {-1, -1});
    for (int e = 0; e < static_cast<int>(surface.size()); ++e)
        if (const int after = surface.next[e]; after >= 0) {
            joined_[e][1] = after;
            joined_[after][0] = e;
        }
    for (int e = 0; e < static_cast<int>(surface.size()); ++e)
        concave_.push_back({concave_at(e, 0), concave_at(e, 1)});
    choose_grid(surface);
    fill_cells(surface);
    find_rectangles();
}

/// Moves the frame to the image in which the ray is at t.
void SegmentCaster::fold_into_period(Ray& ray, double t) const {
    const double x = ray.ox + t * ray.dx - x_min_;
    if (x >= 0 && x <= width_) return;
    const double image = std::floor(x / width_);
    if (image == 0) return;
    ray.ox -= image * width_;
    if (domain_.sides == Sides::mirror && std::fmod(image, 2.0) != 0) {
        ray.ox = -ray.ox;
        ray.flip();
    }
}

/// Brings the ray to the grid; false if it never gets there.
bool SegmentCaster::enter(Ray& ray) const {
    if (ray.oz >= z_top_) {
        if (ray.dz >= 0) return false;
        ray.t = (z_top_ - ray.oz) / ray.dz;
    }
    fold_into_period(ray, ray.t);
    // A ray that runs exactly along a side is moved into the period, where it has one answer.
    if (ray.dx == 0)
        ray.ox = std::clamp(ray.ox, x_min_ + 1e-12 * width_, x_min_ + (1 - 1e-12) * width_);
    const double x = ray.ox + ray.t * ray.dx, z = ray.oz + ray.t * ray.dz;
    ray.ix = std::clamp(static_cast<int>((x - x_min_) * per_cell_x_), 0, nx_ - 1);
    ray.iz = std::clamp(static_cast<int>((z - z_min_) * per_cell_z_), 0, nz_ - 1);
    return true;
}

/// Moves the ray to the cell beyond the edge of a room that it meets first; false if it falls
/// through the bottom or crosses too many sides.
bool SegmentCaster::leave(Ray& ray, const Room& room, double tx, double tz) const {
    ray.t = std::min(tx, tz);
    const Rectangle& r = room.cells;
    const bool right = ray.rightwards(), up = ray.upwards(), aside = tx < tz;
    // Along the other axis the cell never lies behind the present one or outside the room, so
    // round-off cannot keep a ray from getting on.
    const int ix = std::clamp(static_cast<int>((ray.ox + ray.t * ray.dx - x_min_) * per_cell_x_),
                              right ? ray.ix : r.x0, right ? r.x1 : ray.ix);
    const int iz = std::clamp(static_cast<int>((ray.oz + ray.t * ray.dz - z_min_) * per_cell_z_),
                              up ? ray.iz : r.z0, up ? r.z1 : ray.iz);
    const int beyond_x = right ? r.x1 + 1 : r.x0 - 1, beyond_z = up ? r.z1 + 1 : r.z0 - 1;
    ray.ix = aside ? beyond_x : ix;
    ray.iz = aside ? iz : beyond_z;
    if (ray.ix < 0 || ray.ix >= nx_) return cross_side(ray);
    return ray.iz >= 0;
}

bool SegmentCaster::cross_side(Ray& ray) const {
    if (++ray.folds > most_folds) return false;
    const bool right = ray.ix >= nx_;
    if (domain_.sides == Sides::periodic) {
        ray.ox += right ? -width_ : width_;
        ray.ix = right ? 0 : nx_ - 1;
    } else {
        ray.ox = (right ? width_ : -width_) - ray.ox;
        ray.ix = right ? nx_ - 1 : 0;
        ray.flip();
    }
    return true;
}

void SegmentCaster::test_runs(const Ray& ray, const Room& room, Best& best) const {
    const Run* const end = runs_.data() + room.end;
    for (const Run* run = runs_.data() + room.first; run != end; ++run) {
        // From behind nothing is hit. The margin leaves what is level with the ray to the test
        // below.
        const auto facing = [&](const std::array<double, 2>& n) {
            return n[0] * ray.dx + n[1] * ray.dz;
        };
        if (facing(run->normal_first) > 1e-9 && facing(run->normal_last) > 1e-9) continue;
        std::array<double, 8> side;
        for (int k = 0; k < 8; ++k)
            side[k] = ray.dx * (run->z[k] - ray.oz) - ray.dz * (run->x[k] - ray.ox);
        unsigned right = 0; // bit k: vertex k lies on the right of the ray
        for (int k = 0; k < 8; ++k)
            right |= static_cast<unsigned>(side[k] < ray.positive) << k;
        // From the gas the ray sees a segment's start on its right and its end on its left.
        for (unsigned crossed = right & ~(right >> 1) & 0x7fu; crossed != 0;
             crossed &= crossed - 1) {
            const int k = __builtin_ctz(crossed);
            test_segment(ray, *run, k, side[k] / (side[k] - side[k + 1]), best);
        }
    }
}

void SegmentCaster::test_segment(const Ray& ray, const Run& run, int k, double share,
                                 Best& best) const {
    const int element = run.element + k;
    if (element == ray.from && ray.folds == 0) return;
    const double ta = ray.dx * (run.x[k] - ray.ox) + ray.dz * (run.z[k] - ray.oz);
    const double tb = ray.dx * (run.x[k + 1] - ray.ox) + ray.dz * (run.z[k + 1] - ray.oz);
    const double t = ta + share * (tb - ta);
    if (t < -slack_ || t >= best.t) return;
    if (t < slack_ && ray.from >= 0 && behind_at_start(ray.from, element)) return;
    best = {t, share, element};
}

Hit SegmentCaster::finish_hit(const Ray& ray, const Best& best) const {
    Hit hit;
    hit.kind = Hit::Kind::surface;
    hit.element = best.element;
    const double t = std::max(best.t, 0.0);
    hit.distance = t * ray.per_length;
    const auto& e = ends_[best.element];
    const double x = e[0] + best.share * (e[2] - e[0]);
    hit.point = Vec3(std::clamp(x, x_min_, x_min_ + width_), ray.y + t * ray.dy,
                     e[1] + best.share * (e[3] - e[1]));
    hit.direction = ray.direction;
    if (ray.flipped) hit.direction.x = -hit.direction.x;
    return hit;
}

/// Normal (not unit) of the segment at one end of `element`; at a mirror side its own image.
std::array<double, 2> SegmentCaster::normal_beyond(int element, int end) const {
    const int other = joined_[element][end];
    const auto& s = ends_[other < 0 ? element : other];
    return {other < 0 ? s[3] - s[1] : s[1] - s[3], s[2] - s[0]};
}

/// True where the segment beyond rises in front of `element`.
bool SegmentCaster::concave_at(int element, int end) const {
    const auto& own = ends_[element];
    const std::array<double, 2> n = normal_beyond(element, end);
    const double turn = (own[2] - own[0]) * -n[0] - (own[3] - own[1]) * n[1];
    return end == 1 ? turn > 0 : turn < 0;
}

/// A ray that starts, to round-off, in a concave joint and points into the other segment ends
/// there. Which of the two segments its line crosses is then a matter of the last bit.
bool SegmentCaster::starts_in_joint(const Vec3& origin, const Vec3& direction, int from,
                                    Hit& hit) const {
    const auto& own = ends_[from];
    for (int end = 0; end < 2; ++end) {
        if (std::fabs(own[2 * end] - origin.x) + std::fabs(own[2 * end + 1] - origin.z) > slack_)
            continue;
        const std::array<double, 2> n = normal_beyond(from, end);
        if (!concave_[from][end] || n[0] * direction.x + n[1] * direction.z >= 0) continue;
        const bool image = joined_[from][end] < 0;
        hit.kind = Hit::Kind::surface;
        hit.element = image ? from : joined_[from][end];
        hit.point = origin;
        hit.direction = direction;
        if (image) hit.direction.x = -direction.x;
        return true;
    }
    return false;
}

Hit SegmentCaster::finish_open(Ray& ray) const {
    Hit hit;
    hit.kind = Hit::Kind::open;
    const double t = std::max(0.0, (z_open_ - ray.oz) / ray.dz);
    fold_into_period(ray, t);
    hit.distance = t * ray.per_length;
    const double x = ray.ox + t * ray.dx;
    hit.point = Vec3(std::clamp(x, x_min_, x_min_ + width_), ray.y + t * ray.dy, z_open_);
    hit.direction = ray.direction;
    if (ray.flipped) hit.direction.x = -hit.direction.x;
    return hit;
}

Hit SegmentCaster::trace(const Vec3& origin, const Vec3& direction, int from_element) const {
    Hit lost;
    lost.kind = Hit::Kind::lost;
    lost.point = origin;
    lost.direction = direction;
    const double in_plane = std::sqrt(direction.x * direction.x + direction.z * direction.z);
    if (!(in_plane > 1e-12)) return lost; // along y: it meets nothing and never gets out
    if (from_element >= 0 && starts_in_joint(origin, direction, from_element, lost)) return lost;
    Ray ray;
    ray.ox = origin.x;
    ray.oz = origin.z;
    ray.dx = direction.x / in_plane;
    ray.dz = direction.z / in_plane;
    ray.y = origin.y;
    ray.dy = direction.y / in_plane;
    ray.per_length = 1.0 / in_plane;
    ray.inverse_x = safe_inverse(ray.dx);
    ray.inverse_z = safe_inverse(ray.dz);
    ray.positive = 0;
    ray.from = from_element;
    ray.direction = direction;
    if (!enter(ray)) return ray.dz > 0 ? finish_open(ray) : lost;
    Best best;
    for (;;) {
        const Room& room = rooms_[room_of_[ray.iz * nx_ + ray.ix]];
        if (room.end > room.first) test_runs(ray, room, best);
        const double tx = ((ray.rightwards() ? room.x_high : room.x_low) - ray.ox) * ray.inverse_x;
        const double tz = ((ray.upwards() ? room.z_high : room.z_low) - ray.oz) * ray.inverse_z;
        if (best.element >= 0 && best.t <= std::min(tx, tz) + slack_) return finish_hit(ray, best);
        if (!leave(ray, room, tx, tz)) return lost;
        if (ray.iz >= nz_) return finish_open(ray);
    }
}

} // namespace rille::geometry
