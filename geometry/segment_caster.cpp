// SPDX-License-Identifier: Apache-2.0
#include "geometry/segment_caster.hpp"

#include "geometry/check.hpp"
#include "geometry/vertex_sides.hpp"

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

inline double dot(const Pair& a, const Pair& b) {
    const Pair product = a * b;
    return product[0] + product[1];
}

} // namespace

struct SegmentCaster::Ray {
    double ox, oz; ///< origin in the frame of the present image
    double dx, dz; ///< in-plane part of the unit direction
    double square; ///< dx^2 + dz^2
    double inverse_x, inverse_z;
    double positive = 0; ///< a vertex with side(v) >= positive lies on the left
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

/// Where a ray crosses a segment.
struct SegmentCaster::Crossing {
    double x, z;
    double way = std::numeric_limits<double>::infinity(); ///< path length * Ray::square
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
    const std::vector<std::vector<int>> lists = list_elements();
    fill_cells(lists, surface);
    find_rooms();
    find_starts(lists);
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
    double t = 0;
    if (ray.oz >= z_top_) {
        if (ray.dz >= 0) return false;
        t = (z_top_ - ray.oz) / ray.dz;
    }
    fold_into_period(ray, t);
    // A ray that runs exactly along a side is moved into the period, where it has one answer.
    if (ray.dx == 0)
        ray.ox = std::clamp(ray.ox, x_min_ + 1e-12 * width_, x_min_ + (1 - 1e-12) * width_);
    const double x = ray.ox + t * ray.dx, z = ray.oz + t * ray.dz;
    ray.ix = std::clamp(static_cast<int>((x - x_min_) * per_cell_x_), 0, nx_ - 1);
    ray.iz = std::clamp(static_cast<int>((z - z_min_) * per_cell_z_), 0, nz_ - 1);
    return true;
}

/// Moves the ray from a cell to the next one.
inline void SegmentCaster::cross_cell(Ray& ray) const {
    const bool right = ray.rightwards(), up = ray.upwards();
    const double tx = (x_min_ + (ray.ix + right) * cell_x_ - ray.ox) * ray.inverse_x;
    const double tz = (z_min_ + (ray.iz + up) * cell_z_ - ray.oz) * ray.inverse_z;
    const bool aside = tx < tz;
    ray.ix += aside ? 2 * right - 1 : 0;
    ray.iz += aside ? 0 : 2 * up - 1;
}

/// Moves the ray to the cell beyond the edge of a room that it meets first.
inline void SegmentCaster::cross_room(Ray& ray, const Room& room) const {
    const bool right = ray.rightwards(), up = ray.upwards();
    const double tx = (room.x[right] - ray.ox) * ray.inverse_x;
    const double tz = (room.z[up] - ray.oz) * ray.inverse_z;
    const Rectangle& r = room.cells;
    // Along the other axis the cell never lies behind the present one or outside the room, so
    // round-off cannot keep a ray from getting on.
    if (tx < tz) {
        const int iz = static_cast<int>((ray.oz + tx * ray.dz - z_min_) * per_cell_z_);
        ray.iz = std::min(std::max(iz, up ? ray.iz : r.z[0]), up ? r.z[1] : ray.iz);
        ray.ix = r.x[right] + 2 * right - 1;
    } else {
        const int ix = static_cast<int>((ray.ox + tz * ray.dx - x_min_) * per_cell_x_);
        ray.ix = std::min(std::max(ix, right ? ray.ix : r.x[0]), right ? r.x[1] : ray.ix);
        ray.iz = r.z[up] + 2 * up - 1;
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

/// Tests the runs of the ray's cell, of which `run` is the first.
inline bool SegmentCaster::test_runs(const Ray& ray, const Run* run, Crossing& nearest) const {
    alignas(16) std::array<double, run_vertices> side;
    bool found = false;
    for (;; ++run) {
        const unsigned right =
            vertices_on_right<run_vertices>(run->x.data(), run->z.data(), Pair{ray.ox, ray.oz},
                                            Pair{ray.dx, ray.dz}, ray.positive, side.data());
        // From the gas the ray sees a segment's start on its right and its end on its left.
        for (unsigned crossed = right & ~(right >> 1) & run_segments; crossed != 0;
             crossed &= crossed - 1) {
            const int k = __builtin_ctz(crossed);
            found |= test_segment(ray, *run, k, side[k] / (side[k] - side[k + 1]), nearest);
        }
        if (run->last) return found;
    }
}

/// `share` of the way from a to b the ray crosses a segment: takes the crossing if it lies in the
/// ray's cell and nearer than the one so far.
inline bool SegmentCaster::test_segment(const Ray& ray, const Run& run, int k, double share,
                                        Crossing& nearest) const {
    const double x = run.x[k] + share * (run.x[k + 1] - run.x[k]);
    const double z = run.z[k] + share * (run.z[k + 1] - run.z[k]);
    if (std::fabs((x - x_min_) * per_cell_x_ - (ray.ix + 0.5)) > 0.5 + hit_reach) return false;
    if (std::fabs((z - z_min_) * per_cell_z_ - (ray.iz + 0.5)) > 0.5 + hit_reach) return false;
    const double way = (x - ray.ox) * ray.dx + (z - ray.oz) * ray.dz;
    if (way >= nearest.way) return false;
    const int element = run.element + k;
    if (element == ray.from && ray.folds == 0) return false;
    if (!(way > 0 && way * way > slack_ * slack_ * ray.square) &&
        !counts_at_start(ray, element, way))
        return false;
    nearest = {x, z, way, element};
    return true;
}

/// Whether a crossing counts that lies, to round-off, at the origin or behind it.
bool SegmentCaster::counts_at_start(const Ray& ray, int element, double way) const {
    if (way < 0 && way * way > slack_ * slack_ * ray.square) return false;
    return ray.from < 0 || !behind_at_start(ray.from, element);
}

/// `hit` holds the origin and direction of the ray; so it does in finish_open.
inline void SegmentCaster::finish_hit(const Ray& ray, const Crossing& at, Hit& hit) const {
    hit.kind = Hit::Kind::surface;
    hit.element = at.element;
    hit.distance = std::max(at.way, 0.0) / ray.square;
    hit.point = Vec3(std::min(std::max(at.x, x_min_), x_min_ + width_),
                     hit.point.y + hit.distance * hit.direction.y, at.z);
    if (ray.flipped) hit.direction.x = -hit.direction.x;
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

/// The cell beyond the edge of `room` that a ray from before or in it meets first.
[[gnu::always_inline]] inline SegmentCaster::Cell
SegmentCaster::cell_beyond(const Room& room, const Vec3& origin, const Vec3& direction) const {
    const Pair o{origin.x, origin.z}, d{direction.x, direction.z};
    const bool right = !std::signbit(d[0]), up = !std::signbit(d[1]);
    const double tx = (room.x[right] - o[0]) * safe_inverse(d[0]);
    const double tz = (room.z[up] - o[1]) * safe_inverse(d[1]);
    const Pair at =
        (o + std::min(tx, tz) * d - Pair{x_min_, z_min_}) * Pair{per_cell_x_, per_cell_z_};
    const auto within = [](double v, const std::array<int, 2>& range) {
        return std::min(std::max(static_cast<int>(v), range[0]), range[1]);
    };
    if (tx < tz) return {room.beyond.x[right], within(at[1], room.cells.z)};
    return {within(at[0], room.cells.x), room.beyond.z[up]};
}

/// The shortcut that most rays from a surface take: across the room in front of the element, and
/// into a segment behind it. Otherwise false; then `cell` is the one beyond the room, or stays.
[[gnu::always_inline]] inline bool SegmentCaster::trace_across(const Vec3& origin,
                                                               const Vec3& direction, int from,
                                                               Hit& hit, Cell& cell) const {
    const Pair o{origin.x, origin.z}, d{direction.x, direction.z};
    const double square = dot(d, d);
    if (!reaches_room(direction, starts_[from]) || !(square > least_square)) return false;
    cell = cell_beyond(rooms_[starts_[from].room], origin, direction);
    const int content = content_at(cell);
    if (content < 0) return false;
    const Run& run = runs_[content];
    alignas(16) std::array<double, run_vertices> side;
    const unsigned right =
        vertices_on_right<run_vertices>(run.x.data(), run.z.data(), o, d, 0.0, side.data());
    const unsigned crossed = right & ~(right >> 1) & run_segments;
    if (crossed == 0 || (crossed & (crossed - 1)) != 0 || !run.last) return false;
    const int k = __builtin_ctz(crossed);
    const Pair a{run.x[k], run.z[k]}, b{run.x[k + 1], run.z[k + 1]};
    const Pair point = a + side[k] / (side[k] - side[k + 1]) * (b - a);
    const Pair off = (point - Pair{x_min_, z_min_}) * Pair{per_cell_x_, per_cell_z_} -
                     Pair{cell.x + 0.5, cell.z + 0.5};
    if (!(std::max(std::fabs(off[0]), std::fabs(off[1])) <= 0.5 + hit_reach)) return false;
    const double way = dot(point - o, d);
    const int element = run.element + k;
    if (!(way > 0 && way * way > slack_ * slack_ * square) || element == from) return false;
    hit.kind = Hit::Kind::surface;
    hit.element = element;
    hit.distance = way / square;
    hit.point = Vec3(std::min(std::max(point[0], x_min_), x_min_ + width_),
                     origin.y + hit.distance * direction.y, point[1]);
    return true;
}

Hit SegmentCaster::trace(const Vec3& origin, const Vec3& direction, int from_element) const {
    Hit hit;
    hit.direction = direction;
    Cell cell = nowhere;
    if (from_element < 0 || !trace_across(origin, direction, from_element, hit, cell))
        trace_by_cells(origin, direction, from_element, cell, hit);
    return hit;
}

/// From the cell `start`, or else from the one that holds the origin.
void SegmentCaster::trace_by_cells(const Vec3& origin, const Vec3& direction, int from_element,
                                   Cell start, Hit& hit) const {
    hit.kind = Hit::Kind::lost;
    hit.point = origin;
    hit.direction = direction;
    Ray ray;
    ray.ox = origin.x;
    ray.oz = origin.z;
    ray.dx = direction.x;
    ray.dz = direction.z;
    ray.square = direction.x * direction.x + direction.z * direction.z;
    if (!(ray.square > least_square)) return; // along y: it meets nothing and never gets out
    ray.inverse_x = safe_inverse(ray.dx);
    ray.inverse_z = safe_inverse(ray.dz);
    ray.from = from_element;
    if (start.x != nowhere.x) {
        ray.ix = start.x;
        ray.iz = start.z;
    } else {
        if (from_element >= 0 && starts_in_joint(origin, direction, from_element, hit)) return;
        if (!enter(ray)) {
            if (ray.dz > 0) finish_open(ray, hit);
            return;
        }
    }
    for (;;) {
        const int content = content_at({ray.ix, ray.iz});
        if (content >= 0) {
            Crossing nearest;
            if (test_runs(ray, &runs_[content], nearest)) {
                finish_hit(ray, nearest, hit);
                return;
            }
            cross_cell(ray);
        } else if (content != outside) {
            cross_room(ray, rooms_[-1 - content]);
        } else if (ray.iz >= nz_) {
            finish_open(ray, hit);
            return;
        } else if (ray.iz < 0 || !cross_side(ray)) {
            return;
        }
    }
}

} // namespace rille::geometry
