// SPDX-License-Identifier: Apache-2.0
#include "geometry/frustum_caster.hpp"

#include "geometry/check.hpp"

#include <algorithm>
#include <cmath>
#include <limits>

namespace rille::geometry {

namespace {

constexpr int leaf_size = 4;
constexpr int most_reflections = 100000;
constexpr double infinity = std::numeric_limits<double>::infinity();

double length(double x, double y) {
    return std::sqrt(x * x + y * y);
}

} // namespace

/// r^2 = a t^2 + 2 b t + c, z = oz + dz t. A level ray is given the least of slopes: every circle
/// then has its place along the ray.
struct FrustumCaster::Ray {
    double a, b, c, oz, dz, inverse_z;

    Ray(const Vec3& o, const Vec3& d)
        : a(d.x * d.x + d.y * d.y), b(o.x * d.x + o.y * d.y), c(o.x * o.x + o.y * o.y), oz(o.z),
          dz(std::fabs(d.z) < 1e-12 ? std::copysign(1e-12, d.z) : d.z), inverse_z(1 / dz) {}

    double r2(double t) const { return (a * t + 2 * b) * t + c; }
    double way_to(double z) const { return (z - oz) * inverse_z; }
    /// Whether it may meet a box before `most`; `enters`: where it gets to the box's heights.
    bool meets(const Box& box, double least, double most, double& enters) const {
        const double t0 = way_to(box.z_low), t1 = way_to(box.z_high);
        const double low = std::max(std::min(t0, t1), least);
        const double high = std::min(std::max(t0, t1), most);
        enters = low;
        if (!(low <= high)) return false;
        const double at_low = r2(low), at_high = r2(high);
        if (std::max(at_low, at_high) < box.r2_low) return false;
        // a t + b changes sign where the ray passes the axis.
        const double turns_low = a * low + b, turns_high = a * high + b;
        const double least_r2 =
            turns_low < 0 && turns_high > 0 ? c - b * b / a : std::min(at_low, at_high);
        return least_r2 <= box.r2_high;
    }
};

FrustumCaster::FrustumCaster(const Domain& domain, const Surface& surface, double z_open)
    : radius_(domain.width_x()), z_open_(z_open), slack_(1e-9 * domain.spacing), z_top_(-infinity),
      rims_(surface, radius_) {
    RILLE_CHECK(surface.size() > 0, "empty surface");
    const int size = static_cast<int>(surface.size());
    const auto squared = [&](double r) { return r >= radius_ * (1 - 1e-12) ? infinity : r * r; };
    for (const auto& corners : surface.corners) {
        const Vec3 &a = surface.vertices[corners[0]], &b = surface.vertices[corners[1]];
        z_top_ = std::max({z_top_, a.z, b.z});
        frusta_.push_back({a.x, a.z, b.x, b.z, squared(a.x), squared(b.x)});
    }
    convex_.assign(size, {-1, -1});
    concave_.assign(size, {-1, -1});
    for (int e = 0; e < size; ++e) {
        if (frusta_[e].ra == 0) concave_[e][0] = e;
        if (frusta_[e].rb == 0) concave_[e][1] = e;
        if (const int f = surface.next[e]; f >= 0) {
            const Frustum &p = frusta_[e], &q = frusta_[f];
            const double turn =
                (p.rb - p.ra) * (q.zb - q.za) - (p.zb - p.za) * (q.rb - q.ra); // left: positive
            auto& joined = turn > 0 ? concave_ : convex_;
            joined[e][1] = f;
            joined[f][0] = e;
        }
    }
    nodes_.reserve(2 * size / leaf_size + 2);
    build(0, size);
}

FrustumCaster::Box FrustumCaster::box_of(int first, int last) const {
    Box box{infinity, 0, infinity, -infinity};
    double r_low = infinity, r_high = 0;
    for (int e = first; e < last; ++e) {
        const Frustum& f = frusta_[e];
        r_low = std::min({r_low, f.ra, f.rb});
        r_high = std::max({r_high, std::sqrt(f.ra2), std::sqrt(f.rb2)});
        box.z_low = std::min({box.z_low, f.za, f.zb});
        box.z_high = std::max({box.z_high, f.za, f.zb});
    }
    const double pad = 10 * slack_;
    r_low = std::max(0.0, r_low - pad);
    r_high += pad;
    return {r_low * r_low, r_high * r_high, box.z_low - pad, box.z_high + pad};
}

/// The contour runs through space without jumps, so that halves of it make tight boxes.
int FrustumCaster::build(int first, int last) {
    const int id = static_cast<int>(nodes_.size());
    nodes_.push_back({{box_of(first, last), box_of(first, last)}, {-1, -1}, first, last});
    if (last - first <= leaf_size) return id;
    const int middle = first + (last - first) / 2;
    const std::array<int, 2> child{build(first, middle), build(middle, last)};
    nodes_[id].child = child;
    nodes_[id].box = {box_of(first, middle), box_of(middle, last)};
    return id;
}

/// Whether the ray passes through the frustum from its gas side, and how far along. `a` and `b`
/// end it in walking order, the gas on the left: a ray that rises enters the solid where it passes
/// inside the circle of a and outside that of b; one that falls, the other way round.
bool FrustumCaster::cross(const Ray& ray, const Frustum& f, double& way) const {
    const double ta = ray.way_to(f.za), tb = ray.way_to(f.zb);
    const bool in_a = ray.r2(ta) < f.ra2, in_b = ray.r2(tb) < f.rb2;
    const bool rises = ray.dz > 0;
    if (in_a && in_b) return false;
    if (in_a != in_b && in_a != rises) return false;
    // (dz r)^2 = (dz R(z))^2 as A t^2 + 2 B t + C = 0.
    const double rise = f.zb - f.za, widens = f.rb - f.ra;
    const double k = widens * ray.dz, k0 = rise * f.ra + widens * (ray.oz - f.za);
    const double square = rise * rise;
    const double A = square * ray.a - k * k, B = square * ray.b - k * k0;
    const double C = square * ray.c - k0 * k0;
    const double discriminant = B * B - A * C;
    const double low = std::min(ta, tb), high = std::max(ta, tb);
    if (!in_a && !in_b) { // outside both circles: it dips in between, or not
        if (!(A > 0) || !(discriminant > 0) || rise == 0) return false;
        const double middle = -B / A;
        if (!(middle > low && middle < high)) return false;
        const double half = std::sqrt(discriminant) / A;
        way = std::clamp(rise > 0 ? middle + half : middle - half, low, high);
        return true;
    }
    const double q = -(B + std::copysign(std::sqrt(std::max(0.0, discriminant)), B));
    const double one = A != 0 ? q / A : low, two = q != 0 ? C / q : low;
    const auto off = [&](double t) { return std::max({0.0, low - t, t - high}); };
    way = std::clamp(off(one) < off(two) ? one : off(two) < off(one) ? two : one, low, high);
    return true;
}

/// A ray may meet what lies about its start a little behind it, but neither the element it leaves
/// nor one beyond an outer edge.
double FrustumCaster::least_way(int from, int element) const {
    if (from < 0) return -slack_;
    const bool behind =
        element == from || element == convex_[from][0] || element == convex_[from][1];
    return behind ? slack_ : -slack_;
}

/// The element that a ray from an inner edge, or from the tip of a cone, runs into at once; -1:
/// none.
int FrustumCaster::hit_at_start(const Vec3& o, const Vec3& d, int from) const {
    const double r = length(o.x, o.y);
    for (int end = 0; end < 2; ++end) {
        const int other = concave_[from][end];
        if (other < 0) continue;
        const Frustum &own = frusta_[from], &f = frusta_[other];
        const double off =
            std::fabs(r - (end ? own.rb : own.ra)) + std::fabs(o.z - (end ? own.zb : own.za));
        if (off > slack_) continue;
        const double outwards = other == from ? length(d.x, d.y)
                                : r > 0       ? (o.x * d.x + o.y * d.y) / r
                                              : 0;
        if (outwards * (f.za - f.zb) + d.z * (f.rb - f.ra) < 0) return other;
    }
    return -1;
}

void FrustumCaster::nearest(const Ray& ray, int from, double& way, int& element) const {
    struct Task {
        int node;
        double enters;
    };
    std::array<Task, 64> stack;
    int top = 0;
    stack[top++] = {0, -slack_};
    while (top > 0) {
        const Task task = stack[--top];
        if (task.enters > way) continue;
        const Node& node = nodes_[task.node];
        if (node.child[0] < 0) {
            for (int e = node.first; e < node.last; ++e) {
                double t;
                if (!cross(ray, frusta_[e], t) || t >= way || t < least_way(from, e)) continue;
                way = t;
                element = e;
            }
            continue;
        }
        double enters[2];
        bool met[2];
        for (int k = 0; k < 2; ++k)
            met[k] = ray.meets(node.box[k], -10 * slack_, way, enters[k]);
        const int nearer = enters[1] < enters[0];
        if (met[1 - nearer]) stack[top++] = {node.child[1 - nearer], enters[1 - nearer]};
        if (met[nearer]) stack[top++] = {node.child[nearer], enters[nearer]};
    }
}

namespace {

/// Turns the end of a ray into the half-plane y = 0, x >= 0.
void turn_into_plane(Hit& hit) {
    if (hit.point.y == 0 && hit.point.x >= 0) return;
    const double r = length(hit.point.x, hit.point.y);
    if (r > 0) {
        const double c = hit.point.x / r, s = hit.point.y / r;
        const Vec3 d = hit.direction;
        hit.direction = Vec3(c * d.x + s * d.y, c * d.y - s * d.x, d.z);
    }
    hit.point = Vec3(r, 0, hit.point.z);
}

} // namespace

bool FrustumCaster::opens(const Vec3& o, const Vec3& d, int from) const {
    if (!(from >= 0 && d.z > 0 && rims_.serves(from)))
        return trace(o, d, from).kind == Hit::Kind::open;
    const Ray ray(o, d);
    return rims_.passes(from, ray.a, ray.b, ray.c, ray.oz, ray.inverse_z);
}

Hit FrustumCaster::trace(const Vec3& origin, const Vec3& direction, int from) const {
    Hit hit;
    Vec3 o = origin, d = direction;
    double done = 0;
    for (int reflections = 0; reflections < most_reflections; ++reflections) {
        const Ray ray(o, d);
        const double opens = ray.dz > 0 ? std::max(0.0, ray.way_to(z_open_)) : infinity;
        // Where it leaves the cylinder: it starts inside, to round-off.
        const bool clear = d.z >= 0 && o.z > z_top_; // then only the open lies ahead
        const double root = std::sqrt(
            std::max(0.0, ray.b * ray.b - ray.a * std::min(0.0, ray.c - radius_ * radius_)));
        const double leaves = ray.a > 0 && !clear ? (root - ray.b) / ray.a : infinity;
        double way = std::min(opens, leaves) + slack_;
        int element = from < 0 ? -1 : hit_at_start(o, d, from);
        if (element >= 0)
            way = 0;
        else
            nearest(ray, from, way, element);
        if (element < 0) way = std::min(opens, leaves);
        way = std::max(way, 0.0);
        o += d * way;
        done += way;
        if (element >= 0 || opens <= leaves) {
            hit.kind = element >= 0 ? Hit::Kind::surface : Hit::Kind::open;
            hit.element = element;
            hit.distance = done;
            hit.point = o;
            hit.direction = d;
            turn_into_plane(hit);
            return hit;
        }
        const double r = length(o.x, o.y);
        const double outwards = (o.x * d.x + o.y * d.y) / r;
        if (!(outwards > 0)) break;
        o.x *= radius_ / r;
        o.y *= radius_ / r;
        d.x -= 2 * outwards * o.x / radius_;
        d.y -= 2 * outwards * o.y / radius_;
        from = -1;
    }
    hit.kind = Hit::Kind::lost;
    hit.distance = done;
    hit.point = o;
    hit.direction = d;
    turn_into_plane(hit);
    return hit;
}

} // namespace rille::geometry
