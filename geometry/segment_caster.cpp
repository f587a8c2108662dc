// SPDX-License-Identifier: Apache-2.0
#include "geometry/segment_caster.hpp"

#include "geometry/check.hpp"

#include <algorithm>
#include <cmath>
#include <limits>
#ifdef __SSE2__
#include <emmintrin.h>
#endif

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

struct Pair {
    double x, z;
};

/// Bit k: vertex k lies on the right of the ray through o along d; side: its cross product with d.
/// `count` is even, x and z aligned to 16 bytes. Both ways give the same bits.
template <int count>
inline unsigned vertices_on_right(const double* x, const double* z, const Pair& o, const Pair& d,
                                  double positive, double* side) {
    unsigned right = 0;
#ifdef __SSE2__
    const __m128d ox = _mm_set1_pd(o.x), oz = _mm_set1_pd(o.z);
    const __m128d dx = _mm_set1_pd(d.x), dz = _mm_set1_pd(d.z), limit = _mm_set1_pd(positive);
    for (int k = 0; k < count; k += 2) {
        const __m128d along = _mm_mul_pd(dx, _mm_sub_pd(_mm_load_pd(z + k), oz));
        const __m128d across = _mm_mul_pd(dz, _mm_sub_pd(_mm_load_pd(x + k), ox));
        const __m128d s = _mm_sub_pd(along, across);
        _mm_store_pd(side + k, s);
        right |= static_cast<unsigned>(_mm_movemask_pd(_mm_cmplt_pd(s, limit))) << k;
    }
#else
    for (int k = 0; k < count; ++k) {
        side[k] = d.x * (z[k] - o.z) - d.z * (x[k] - o.x);
        right |= static_cast<unsigned>(side[k] < positive) << k;
    }
#endif
    return right;
}

} // namespace

struct SegmentCaster::Ray {
    double ox, oz;         ///< origin in the frame of the present image
    double dx, dz;         ///< in-plane part of the unit direction: t is path length
    double inverse_square; ///< 1 / (dx^2 + dz^2)
    double slack;          ///< `slack_` as path length
    double inverse_x, inverse_z;
    double positive; ///< a vertex with side(v) >= positive lies on the left
    double t = 0;    ///< path length so far
    int ix = 0, iz = 0;
    int from = -1;
    int folds = 0;
    bool flipped = false; ///< x runs backwards in this image

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
    const Run* run = nullptr;
    int k = 0; ///< segment of the run
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
    lay_out_cells();
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

/// Moves the ray from a cell to the next one.
inline void SegmentCaster::cross_cell(Ray& ray, bool aside) const {
    const int x = ray.rightwards() ? 1 : -1, z = ray.upwards() ? 1 : -1;
    ray.ix += aside ? x : 0;
    ray.iz += aside ? 0 : z;
}

/// Moves the ray to the cell beyond the edge of a room that it meets first.
inline void SegmentCaster::cross_room(Ray& ray, const Rectangle& r, bool aside) const {
    const bool right = ray.rightwards(), up = ray.upwards();
    // Along the other axis the cell never lies behind the present one or outside the room, so
    // round-off cannot keep a ray from getting on.
    if (aside) {
        const double z = (ray.oz + ray.t * ray.dz - z_min_) * per_cell_z_;
        ray.ix = right ? r.x1 + 1 : r.x0 - 1;
        ray.iz = std::clamp(static_cast<int>(z), up ? ray.iz : r.z0, up ? r.z1 : ray.iz);
    } else {
        const double x = (ray.ox + ray.t * ray.dx - x_min_) * per_cell_x_;
        ray.iz = up ? r.z1 + 1 : r.z0 - 1;
        ray.ix = std::clamp(static_cast<int>(x), right ? ray.ix : r.x0, right ? r.x1 : ray.ix);
    }
}

/// Takes a ray that left the period at a side into the next image; false after too many sides.
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

/// Tests the runs of one cell, of which `run` is the first.
inline void SegmentCaster::test_runs(const Ray& ray, const Run* run, Best& best) const {
    constexpr unsigned segments = (1u << run_length) - 1;
    alignas(16) std::array<double, run_vertices> side;
    for (;; ++run) {
        const unsigned right =
            vertices_on_right<run_vertices>(run->x.data(), run->z.data(), {ray.ox, ray.oz},
                                            {ray.dx, ray.dz}, ray.positive, side.data());
        // From the gas the ray sees a segment's start on its right and its end on its left.
        for (unsigned crossed = right & ~(right >> 1) & segments; crossed != 0;
             crossed &= crossed - 1) {
            const int k = __builtin_ctz(crossed);
            test_segment(ray, *run, k, side[k] / (side[k] - side[k + 1]), best);
        }
        if (run->last) return;
    }
}

inline void SegmentCaster::test_segment(const Ray& ray, const Run& run, int k, double share,
                                        Best& best) const {
    const int element = run.element + k;
    if (element == ray.from && ray.folds == 0) return;
    const double ta = ray.dx * (run.x[k] - ray.ox) + ray.dz * (run.z[k] - ray.oz);
    const double tb = ray.dx * (run.x[k + 1] - ray.ox) + ray.dz * (run.z[k + 1] - ray.oz);
    const double t = (ta + share * (tb - ta)) * ray.inverse_square;
    if (t < -ray.slack || t >= best.t) return;
    if (t < ray.slack && ray.from >= 0 && behind_at_start(ray.from, element)) return;
    best = {t, share, &run, k};
}

/// `hit` holds the origin and direction of the ray; so it does in finish_open.
void SegmentCaster::finish_hit(const Ray& ray, const Best& best, Hit& hit) const {
    const Run& run = *best.run;
    const int k = best.k;
    hit.kind = Hit::Kind::surface;
    hit.element = run.element + k;
    hit.distance = std::max(best.t, 0.0);
    const double x = run.x[k] + best.share * (run.x[k + 1] - run.x[k]);
    hit.point =
        Vec3(std::clamp(x, x_min_, x_min_ + width_), hit.point.y + hit.distance * hit.direction.y,
             run.z[k] + best.share * (run.z[k + 1] - run.z[k]));
    if (ray.flipped) hit.direction.x = -hit.direction.x;
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

/// Whether nothing in the cell that the ray starts in can be in its way. The margin is for rays
/// along a straight wall, which round-off takes to either side of it.
bool SegmentCaster::clears_own_cell(const Vec3& direction, int from) const {
    constexpr double margin = 1e-6;
    const auto& own = ends_[from];
    const double sx = own[2] - own[0], sz = own[3] - own[1];
    const double up = sx * direction.z - sz * direction.x;
    const double along = sx * direction.x + sz * direction.z;
    return up > (skyline_[from] + margin) * std::fabs(along);
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

void SegmentCaster::finish_open(Ray& ray, Hit& hit) const {
    hit.kind = Hit::Kind::open;
    hit.distance = std::max(0.0, (z_open_ - ray.oz) / ray.dz);
    fold_into_period(ray, hit.distance);
    const double x = ray.ox + hit.distance * ray.dx;
    hit.point = Vec3(std::clamp(x, x_min_, x_min_ + width_),
                     hit.point.y + hit.distance * hit.direction.y, z_open_);
    if (ray.flipped) hit.direction.x = -hit.direction.x;
}

Hit SegmentCaster::trace(const Vec3& origin, const Vec3& direction, int from_element) const {
    Hit hit;
    hit.kind = Hit::Kind::lost;
    hit.point = origin;
    hit.direction = direction;
    const double square = direction.x * direction.x + direction.z * direction.z;
    if (!(square > 1e-24)) return hit; // along y: it meets nothing and never gets out
    if (from_element >= 0 && starts_in_joint(origin, direction, from_element, hit)) return hit;
    Ray ray;
    ray.ox = origin.x;
    ray.oz = origin.z;
    ray.dx = direction.x;
    ray.dz = direction.z;
    ray.inverse_square = 1.0 / square;
    ray.slack = slack_ * std::sqrt(square) * ray.inverse_square;
    ray.inverse_x = safe_inverse(ray.dx);
    ray.inverse_z = safe_inverse(ray.dz);
    ray.positive = 0;
    ray.from = from_element;
    if (!enter(ray)) {
        if (ray.dz > 0) finish_open(ray, hit);
        return hit;
    }
    Best best;
    bool seen = from_element >= 0 && ray.t == 0 && clears_own_cell(direction, from_element);
    for (;;) {
        const int content = content_[ray.iz * next_z_ + ray.ix * next_x_];
        const bool right = ray.rightwards(), up = ray.upwards();
        double tx, tz;
        if (content >= 0) {
            if (!seen) test_runs(ray, &runs_[content], best);
            seen = false;
            tx = (x_min_ + (ray.ix + right) * cell_x_ - ray.ox) * ray.inverse_x;
            tz = (z_min_ + (ray.iz + up) * cell_z_ - ray.oz) * ray.inverse_z;
        } else {
            const Room& room = rooms_[-1 - content];
            tx = ((right ? room.x_high : room.x_low) - ray.ox) * ray.inverse_x;
            tz = ((up ? room.z_high : room.z_low) - ray.oz) * ray.inverse_z;
        }
        ray.t = std::min(tx, tz);
        if (best.run && best.t <= ray.t + ray.slack) {
            finish_hit(ray, best, hit);
            return hit;
        }
        if (content >= 0)
            cross_cell(ray, tx < tz);
        else
            cross_room(ray, rooms_[-1 - content].cells, tx < tz);
        if ((ray.ix < 0 || ray.ix >= nx_) && !cross_side(ray)) return hit;
        if (ray.iz < 0) return hit;
        if (ray.iz >= nz_) {
            finish_open(ray, hit);
            return hit;
        }
    }
}

} // namespace rille::geometry
