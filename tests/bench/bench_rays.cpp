// SPDX-License-Identifier: Apache-2.0
// First hits of diffuse rays on one core: the ray caster against bare Embree on the same surface.
#include "geometry/ray_caster.hpp"
#include "tests/bench/timing.hpp"
#include "tests/support/random_rays.hpp"
#include "tests/support/shapes.hpp"

#include <embree3/rtcore.h>
#include <nlohmann/json.hpp>

#include <iostream>
#include <limits>

using namespace rille::bench;
using namespace rille::geometry;
using namespace rille::tests;

namespace {

/// Cosine-law rays from element centres in turn, in an order that jumps about the surface.
std::vector<RayStart> diffuse_rays(const Surface& s, const std::vector<int>& from, int count) {
    std::vector<RayStart> rays;
    for (int n = 0; n < count; ++n) {
        const int e = from[static_cast<std::size_t>(uniform(1, 3 * n) * from.size())];
        rays.push_back({s.centre[e],
                        cosine_direction(s.normal[e], uniform(1, 3 * n + 1), uniform(1, 3 * n + 2)),
                        e});
    }
    return rays;
}

/// Embree with its defaults: fast traversal, no filter, no sides, single precision.
class BareEmbree {
public:
    BareEmbree(const std::vector<Vec3>& points, const std::vector<std::array<int, 4>>& quads)
        : device_(rtcNewDevice(nullptr)), scene_(rtcNewScene(device_)) {
        RTCGeometry g = rtcNewGeometry(device_, RTC_GEOMETRY_TYPE_QUAD);
        auto* p = static_cast<float*>(rtcSetNewGeometryBuffer(
            g, RTC_BUFFER_TYPE_VERTEX, 0, RTC_FORMAT_FLOAT3, 12, points.size()));
        auto* q = static_cast<unsigned*>(rtcSetNewGeometryBuffer(
            g, RTC_BUFFER_TYPE_INDEX, 0, RTC_FORMAT_UINT4, 16, quads.size()));
        for (const Vec3& v : points)
            for (int c = 0; c < 3; ++c)
                *p++ = static_cast<float>(v[c]);
        for (const auto& quad : quads)
            for (const int v : quad)
                *q++ = static_cast<unsigned>(v);
        rtcCommitGeometry(g);
        rtcAttachGeometry(scene_, g);
        rtcReleaseGeometry(g);
        rtcCommitScene(scene_);
    }
    ~BareEmbree() {
        rtcReleaseScene(scene_);
        rtcReleaseDevice(device_);
    }
    RTCRayHit prepare(const RayStart& r, const Vec3& normal) const {
        RTCRayHit h{};
        const Vec3 o = r.origin + 1e-3 * normal; // off the element that it leaves
        h.ray.org_x = static_cast<float>(o.x);
        h.ray.org_y = static_cast<float>(o.y);
        h.ray.org_z = static_cast<float>(o.z);
        h.ray.dir_x = static_cast<float>(r.direction.x);
        h.ray.dir_y = static_cast<float>(r.direction.y);
        h.ray.dir_z = static_cast<float>(r.direction.z);
        h.ray.tfar = std::numeric_limits<float>::infinity();
        h.ray.mask = ~0u;
        h.hit.geomID = RTC_INVALID_GEOMETRY_ID;
        return h;
    }
    int trace(RTCRayHit h) const {
        RTCIntersectContext context;
        rtcInitIntersectContext(&context);
        rtcIntersect1(scene_, &context, &h);
        return h.hit.geomID == RTC_INVALID_GEOMETRY_ID ? -1 : static_cast<int>(h.hit.primID);
    }

private:
    RTCDevice device_;
    RTCScene scene_;
};

/// Times both on the same rays; the share of equal answers says that they do the same work.
nlohmann::json run(const std::string& name, const RayCaster& caster, const BareEmbree& embree,
                   const Surface& s, const std::vector<RayStart>& rays, int repeats) {
    std::vector<RTCRayHit> prepared;
    for (const RayStart& r : rays)
        prepared.push_back(embree.prepare(r, s.normal[r.from_element]));
    constexpr std::size_t at_once = 256; // as a caller that goes through elements has them
    std::vector<Hit> hits(at_once);
    std::vector<int> ours(rays.size()), theirs(rays.size());
    const Comparison c = compare(
        repeats,
        [&] {
            for (std::size_t n = 0; n < rays.size(); n += at_once) {
                const std::size_t count = std::min(at_once, rays.size() - n);
                caster.trace(rays.data() + n, count, hits.data());
                for (std::size_t k = 0; k < count; ++k)
                    ours[n + k] = hits[k].element;
            }
        },
        [&] {
            for (std::size_t n = 0; n < rays.size(); ++n)
                theirs[n] = embree.trace(prepared[n]);
        });
    std::size_t same = 0;
    for (std::size_t n = 0; n < rays.size(); ++n)
        same += ours[n] == theirs[n];
    return {{"bench", name},
            {"ratio", c.ratio},
            {"ours_rays_per_s", rays.size() / c.ours},
            {"embree_rays_per_s", rays.size() / c.theirs},
            {"elements", s.size()},
            {"rays", rays.size()},
            {"same_element", double(same) / rays.size()},
            {"lost", caster.lost()},
            {"goal", 1},
            {"threads", 1}};
}

std::vector<int> walls_of(const Surface& s) {
    std::vector<int> walls;
    for (int e = 0; e < static_cast<int>(s.size()); ++e)
        if (std::fabs(s.normal[e].z) < 0.5) walls.push_back(e);
    return walls;
}

nlohmann::json extruded() {
    // 3,000 segments of one cell: a trench 100 wide and 1,400 deep, 50 of mask on either side.
    Domain domain;
    domain.cells_x = 200;
    const Surface s = trench(domain, 100, 1400, 1.0);
    std::vector<Vec3> points;
    std::vector<std::array<int, 4>> quads;
    const double reach = 1e5; // along y; the longest ray in 10^6 stays inside
    for (const Vec3& v : s.vertices) {
        points.push_back({v.x, reach, v.z});
        points.push_back({v.x, -reach, v.z});
    }
    for (const auto& c : s.corners)
        quads.push_back({2 * c[0], 2 * c[0] + 1, 2 * c[1] + 1, 2 * c[1]});
    const RayCaster caster(domain, s, 1.0);
    nlohmann::json line = run("rays_extruded", caster, BareEmbree(points, quads), s,
                              diffuse_rays(s, walls_of(s), 300000), 9);
    line["goal"] = 3;
    line["note"] =
        "256 rays a call; double precision, watertight, sides built in; Embree in single precision "
        "without sides or start filter";
    return line;
}

nlohmann::json full() {
    // A round hole of radius 40 cells and depth 640 cells (aspect ratio 8), quads of one cell.
    Domain domain;
    domain.symmetry = Symmetry::full;
    domain.cells_x = domain.cells_y = 120;
    std::vector<std::array<double, 2>> profile;
    for (int z = 0; z <= 640; ++z)
        profile.push_back({40, -double(z)});
    for (int r = 39; r >= 0; --r)
        profile.push_back({double(r), -640});
    const Surface s = revolved_hole(domain, profile, 256);
    const RayCaster caster(domain, s, 1.0);
    nlohmann::json line = run("rays_full", caster, BareEmbree(s.vertices, s.corners), s,
                              diffuse_rays(s, walls_of(s), 200000), 9);
    line["note"] =
        "uses Embree: robust traversal (alone 0.7 of the default rate), start filter and "
        "sides on top of rtcIntersect1";
    return line;
}

} // namespace

int main() {
    std::cout << full().dump() << std::endl;
    std::cout << extruded().dump() << std::endl;
}
