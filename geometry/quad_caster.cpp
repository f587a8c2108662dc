// SPDX-License-Identifier: Apache-2.0
#include "geometry/quad_caster.hpp"

#include "geometry/check.hpp"
#include "geometry/facets.hpp"

#include <embree3/rtcore.h>
#include <tbb/task_arena.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <limits>

namespace rille::geometry {

namespace {

constexpr double infinite = std::numeric_limits<double>::infinity();
// A ray that runs between pillars may cross many periods; this many means it found a gap.
constexpr int most_folds = 20000;
// [cells] Beyond a side lie images of the elements next to it. A ray is followed this far into
// them, so that a hit on the side itself is not lost between two images.
constexpr double beyond = 0.5;

/// What the filter needs to know of the ray's start, in the frame of the present image.
struct StartContext {
    RTCIntersectContext context; // must come first: Embree hands its address back
    const std::vector<Vec3>* vertices;
    const std::vector<std::array<int, 4>>* quads;
    int own_quad;                  ///< of the element the ray leaves; -1 after a fold and for none
    int own_facet;                 ///< likewise
    Vec3 from_centre, from_normal; ///< of the facet
    float near;                    ///< hits before this ray parameter are at the start of the ray
};

} // namespace

struct QuadCaster::Scene {
    RTCDevice device = nullptr;
    RTCScene scene = nullptr;
    std::vector<Vec3> vertices;
    std::vector<std::array<int, 4>> quads;         ///< the elements first, then their images
    std::vector<int> source;                       ///< element of each quad
    std::vector<std::array<signed char, 2>> image; ///< periods by which each quad is moved
    std::vector<Vec3> out; ///< of each vertex of the period: area-weighted sum of normals
    Vec3 middle;           ///< subtracted from what Embree sees

    ~Scene() {
        if (scene) rtcReleaseScene(scene);
        if (device) rtcReleaseDevice(device);
    }
    void add_images(const Domain&, const Surface&, double skirt);
    void add_image(const Domain&, const Surface&, int sx, int sy, double skirt);
    void build();
    int first_hit(StartContext&, const Vec3& origin, const Vec3& direction, double reach,
                  double slack, double& t) const;
};

namespace {

/// Rejects the back of facets and what a ray cannot meet where it starts.
void filter_start(const RTCFilterFunctionNArguments* args) {
    const auto* start = reinterpret_cast<const StartContext*>(args->context);
    const auto* ray = reinterpret_cast<const RTCRay*>(args->ray);
    const auto* hit = reinterpret_cast<const RTCHit*>(args->hit);
    const float along = hit->Ng_x * ray->dir_x + hit->Ng_y * ray->dir_y + hit->Ng_z * ray->dir_z;
    const int quad = static_cast<int>(hit->primID);
    const int which = hit->u + hit->v > 1 ? 1 : 0; // how Embree numbers the halves of a quad
    bool reject = along >= 0 || (quad == start->own_quad && which == start->own_facet);
    // What lies behind the plane of the facet cannot be in front of a ray that has just left it.
    if (!reject && ray->tfar < start->near) {
        const Vec3 centre = facet(*start->vertices, (*start->quads)[quad], which).centre();
        reject = (centre - start->from_centre).dot(start->from_normal) < 1e-9;
    }
    if (reject) args->valid[0] = 0;
}

} // namespace

void QuadCaster::Scene::add_image(const Domain& domain, const Surface& surface, int sx, int sy,
                                  double skirt) {
    const bool mirror = domain.sides == Sides::mirror;
    const auto moved = [&](Vec3 p) {
        if (sx != 0) p.x = mirror ? sx * domain.width_x() - p.x : p.x + sx * domain.width_x();
        if (sy != 0) p.y = mirror ? sy * domain.width_y() - p.y : p.y + sy * domain.width_y();
        return p;
    };
    const bool turned = mirror && (sx != 0) != (sy != 0);
    const double reach_x = 0.5 * domain.width_x() + skirt, reach_y = 0.5 * domain.width_y() + skirt;
    std::vector<int> number(surface.vertices.size(), -1);
    for (std::size_t e = 0; e < surface.size(); ++e) {
        std::array<int, 4> quad = surface.corners[e];
        double low_x = infinite, low_y = infinite; // distance of the image from the middle
        for (const int v : quad) {
            const Vec3 p = moved(surface.vertices[v]);
            low_x = std::min(low_x, sx == 0 ? 0.0 : sx * p.x);
            low_y = std::min(low_y, sy == 0 ? 0.0 : sy * p.y);
        }
        if (low_x > reach_x || low_y > reach_y) continue;
        for (int& v : quad) {
            if (number[v] < 0) {
                number[v] = static_cast<int>(vertices.size());
                vertices.push_back(moved(surface.vertices[v]));
            }
            v = number[v];
        }
        if (turned) // keeps the gas in front; a triangle keeps its double corner last
            quad = quad[2] == quad[3] ? std::array<int, 4>{quad[0], quad[2], quad[1], quad[1]}
                                      : std::array<int, 4>{quad[0], quad[3], quad[2], quad[1]};
        quads.push_back(quad);
        source.push_back(static_cast<int>(e));
        image.push_back({static_cast<signed char>(sx), static_cast<signed char>(sy)});
    }
}

void QuadCaster::Scene::add_images(const Domain& domain, const Surface& surface, double skirt) {
    vertices = surface.vertices;
    quads = surface.corners;
    for (std::size_t e = 0; e < surface.size(); ++e)
        source.push_back(static_cast<int>(e));
    image.assign(surface.size(), {0, 0});
    out.assign(vertices.size(), Vec3(0, 0, 0));
    for (std::size_t e = 0; e < surface.size(); ++e)
        for (const int v : surface.corners[e])
            out[v] += surface.normal[e] * surface.area[e];
    for (int sy = -1; sy <= 1; ++sy)
        for (int sx = -1; sx <= 1; ++sx)
            if (sx != 0 || sy != 0) add_image(domain, surface, sx, sy, skirt);
}

void QuadCaster::Scene::build() {
    device = rtcNewDevice(nullptr);
    RILLE_CHECK(device, "Embree does not start");
    scene = rtcNewScene(device);
    rtcSetSceneFlags(scene, static_cast<RTCSceneFlags>(RTC_SCENE_FLAG_ROBUST |
                                                       RTC_SCENE_FLAG_CONTEXT_FILTER_FUNCTION));
    RTCGeometry geometry = rtcNewGeometry(device, RTC_GEOMETRY_TYPE_QUAD);
    auto* points = static_cast<float*>(rtcSetNewGeometryBuffer(geometry, RTC_BUFFER_TYPE_VERTEX, 0,
                                                               RTC_FORMAT_FLOAT3, 3 * sizeof(float),
                                                               vertices.size()));
    auto* indices = static_cast<unsigned*>(rtcSetNewGeometryBuffer(
        geometry, RTC_BUFFER_TYPE_INDEX, 0, RTC_FORMAT_UINT4, 4 * sizeof(unsigned), quads.size()));
    RILLE_CHECK(points && indices, "Embree has no memory for the surface");
    for (const Vec3& v : vertices)
        for (int c = 0; c < 3; ++c)
            *points++ = static_cast<float>(v[c] - middle[c]);
    for (const auto& quad : quads)
        for (const int v : quad)
            *indices++ = static_cast<unsigned>(v);
    rtcCommitGeometry(geometry);
    rtcAttachGeometry(scene, geometry);
    rtcReleaseGeometry(geometry);
    // One thread builds: the tree, and with it the choice between equal distances, is then always
    // the same.
    tbb::task_arena(1).execute([&] { rtcCommitScene(scene); });
    RILLE_CHECK(rtcGetDeviceError(device) == RTC_ERROR_NONE, "Embree cannot build its tree");
}

/// Quad first met within `reach`, -1 for none, and the distance t. The search begins 2 `slack`
/// behind the origin and `slack` above the element, so that a concave neighbour is met wherever
/// single precision puts it.
int QuadCaster::Scene::first_hit(StartContext& start, const Vec3& origin, const Vec3& direction,
                                 double reach, double slack, double& t) const {
    Vec3 o = origin - middle - 2 * slack * direction;
    if (start.own_quad >= 0) o += slack * start.from_normal;
    RTCRayHit rh{};
    rh.ray.org_x = static_cast<float>(o.x);
    rh.ray.org_y = static_cast<float>(o.y);
    rh.ray.org_z = static_cast<float>(o.z);
    rh.ray.dir_x = static_cast<float>(direction.x);
    rh.ray.dir_y = static_cast<float>(direction.y);
    rh.ray.dir_z = static_cast<float>(direction.z);
    rh.ray.tfar = static_cast<float>(reach + 2 * slack);
    rh.ray.mask = ~0u;
    rh.hit.geomID = RTC_INVALID_GEOMETRY_ID;
    rtcIntersect1(scene, &start.context, &rh);
    t = rh.ray.tfar - 2 * slack;
    return rh.hit.geomID == RTC_INVALID_GEOMETRY_ID ? -1 : static_cast<int>(rh.hit.primID);
}

struct QuadCaster::Ray {
    Vec3 origin;       ///< in the frame of the present image
    Vec3 direction;    ///< likewise
    double length = 0; ///< [nm] from the start of the ray to `origin`
    Vec3 from_centre, from_normal;
};

QuadCaster::QuadCaster(const Domain& domain, const Surface& surface, double z_open)
    : domain_(domain), z_open_(z_open), scene_(std::make_unique<Scene>()) {
    RILLE_CHECK(surface.size() > 0, "empty surface");
    double low = infinite, high = -infinite;
    for (const Vec3& v : surface.vertices) {
        low = std::min(low, v.z);
        high = std::max(high, v.z);
    }
    RILLE_CHECK(z_open >= high, "the source plane lies below the top of the surface");
    const double extent = std::max({domain.width_x(), domain.width_y(), high - low});
    slack_ = 8 * std::numeric_limits<float>::epsilon() * extent;
    z_top_ = high + 4 * slack_;
    z_bottom_ = low - 4 * slack_;
    scene_->middle = Vec3(0, 0, 0.5 * (low + high));
    scene_->add_images(domain, surface, domain.spacing);
    scene_->build();
}

QuadCaster::~QuadCaster() = default;

/// Brings origin, direction and the start element into the period.
void QuadCaster::fold(Ray& ray) const {
    for (int axis = 0; axis < 2; ++axis) {
        const double width = axis == 0 ? domain_.width_x() : domain_.width_y();
        if (std::fabs(ray.origin[axis]) <= 0.5 * width)
            continue; // a ray on a side stays in the period of the element it leaves
        const double image = std::floor(ray.origin[axis] / width + 0.5);
        const bool turn = domain_.sides == Sides::mirror && std::fmod(image, 2.0) != 0;
        for (Vec3* p : {&ray.origin, &ray.from_centre}) {
            (*p)[axis] -= image * width;
            if (turn) (*p)[axis] = -(*p)[axis];
        }
        if (!turn) continue;
        ray.direction[axis] = -ray.direction[axis];
        ray.from_normal[axis] = -ray.from_normal[axis];
    }
}

/// Moves a ray that starts above everything down to the surface's top; false if it never gets
/// there.
bool QuadCaster::enter(Ray& ray) const {
    if (ray.origin.z > z_top_) {
        if (ray.direction.z >= 0) return false;
        const double t = (z_top_ - ray.origin.z) / ray.direction.z;
        ray.origin += t * ray.direction;
        ray.length += t;
    }
    fold(ray);
    return true;
}

/// Path to the nearest side, and which axis it lies on.
double QuadCaster::way_to_side(const Ray& ray, int& axis) const {
    double way = infinite;
    const double half[2] = {0.5 * domain_.width_x(), 0.5 * domain_.width_y()};
    for (int a = 0; a < 2; ++a) {
        const double d = ray.direction[a];
        if (d == 0) continue;
        const double t = ((d > 0 ? half[a] : -half[a]) - ray.origin[a]) / d;
        if (t >= way) continue;
        way = t;
        axis = a;
    }
    return std::max(way, 0.0);
}

/// The ray, now at a side, continues in the next image.
void QuadCaster::cross_side(Ray& ray, int axis) const {
    const double width = axis == 0 ? domain_.width_x() : domain_.width_y();
    const double side = ray.direction[axis] > 0 ? 0.5 * width : -0.5 * width;
    if (domain_.sides == Sides::periodic) {
        ray.origin[axis] = -side;
        ray.from_centre[axis] -= 2 * side;
        return;
    }
    ray.origin[axis] = side;
    ray.direction[axis] = -ray.direction[axis];
    ray.from_centre[axis] = 2 * side - ray.from_centre[axis];
    ray.from_normal[axis] = -ray.from_normal[axis];
}

/// Brings a ray that ended on an image of an element to the element itself.
void QuadCaster::leave_image(Ray& ray, int quad) const {
    for (int axis = 0; axis < 2; ++axis) {
        const double width = axis == 0 ? domain_.width_x() : domain_.width_y();
        double& p = ray.origin[axis];
        if (const int image = scene_->image[quad][axis]; image != 0) {
            p -= image * width;
            if (domain_.sides == Sides::mirror) {
                p = -p;
                ray.direction[axis] = -ray.direction[axis];
            }
        }
        p = std::clamp(p, -0.5 * width, 0.5 * width);
    }
}

Hit QuadCaster::finish(Ray& ray, Hit::Kind kind, int quad, double t) const {
    Hit hit;
    hit.kind = kind;
    hit.distance = std::max(0.0, ray.length + t);
    ray.origin += t * ray.direction;
    if (quad >= 0) {
        leave_image(ray, quad);
        hit.element = scene_->source[quad];
    } else {
        fold(ray);
    }
    hit.point = ray.origin;
    hit.direction = ray.direction;
    return hit;
}

/// Elements squeezed next to a sharp edge may lie a little below the surface, and a ray that starts
/// there into the solid meets nothing. It is sent again from above the surface at its start.
Hit QuadCaster::trace(const Vec3& origin, const Vec3& direction, int from_element) const {
    Hit hit = follow(origin, direction, from_element);
    if (from_element < 0) return hit;
    for (const double lift : {0.25, 0.5, 1.0}) {
        if (hit.kind != Hit::Kind::lost) break;
        Vec3 out(0, 0, 0);
        for (const int v : scene_->quads[from_element])
            out += scene_->out[v];
        hit = follow(origin + out.normalized() * (lift * domain_.spacing), direction, -1);
    }
    return hit;
}

Hit QuadCaster::follow(const Vec3& origin, const Vec3& direction, int from_element) const {
    const Scene& scene = *scene_;
    Ray ray{origin, direction, 0, Vec3(0), Vec3(0)};
    StartContext start;
    rtcInitIntersectContext(&start.context);
    start.context.filter = filter_start;
    start.vertices = &scene.vertices;
    start.quads = &scene.quads;
    start.own_quad = from_element;
    if (from_element >= 0) {
        const auto& quad = scene.quads[from_element];
        start.own_facet = facet_at(scene.vertices, quad, origin);
        const Facet own = facet(scene.vertices, quad, start.own_facet);
        ray.from_centre = own.centre();
        const Vec3 cross = own.cross();
        ray.from_normal = cross / std::max(cross.length(), 1e-300);
    }
    const auto to_open = [&] {
        return finish(ray, Hit::Kind::open, -1,
                      std::max(0.0, (z_open_ - ray.origin.z) / ray.direction.z));
    };
    if (!enter(ray)) return direction.z > 0 ? to_open() : finish(ray, Hit::Kind::lost, -1, 0);
    for (int folds = 0; folds < most_folds; ++folds) {
        int axis = 0;
        const double side = way_to_side(ray, axis);
        const double top =
            ray.direction.z > 0 ? (z_top_ - ray.origin.z) / ray.direction.z : infinite;
        if (ray.direction.z <= 0 && ray.origin.z < z_bottom_) break; // below everything
        start.from_centre = ray.from_centre;
        start.from_normal = ray.from_normal;
        start.near = from_element < 0 ? -1.0f : static_cast<float>(6 * slack_ - ray.length);
        double t = 0;
        const int quad = scene.first_hit(start, ray.origin, ray.direction,
                                         std::min(side, top) + beyond * domain_.spacing, slack_, t);
        if (quad >= 0) return finish(ray, Hit::Kind::surface, quad, t);
        if (top <= side) return top < infinite ? to_open() : finish(ray, Hit::Kind::lost, -1, 0);
        ray.origin += side * ray.direction;
        ray.length += side;
        start.own_quad = -1;
        cross_side(ray, axis);
    }
    return finish(ray, Hit::Kind::lost, -1, 0);
}

} // namespace rille::geometry
