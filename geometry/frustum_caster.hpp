// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "geometry/bore_rims.hpp"
#include "geometry/domain.hpp"
#include "geometry/ray_caster.hpp"
#include "geometry/surface.hpp"

#include <array>
#include <vector>

namespace rille::geometry {

/// First hits on a surface of revolution. Along a ray the squared distance from the axis is a
/// quadratic in the path length, so that it crosses the frustum of a segment at the roots of a
/// quadratic: exact in three dimensions, no facets. A binary tree over the segments in walking
/// order holds boxes in (r, z); the ray, a hyperbola there, meets a box where its heights and its
/// distances from the axis overlap those of the box.
///
/// Watertight: the distance from the axis less the radius of a segment is convex along a ray. So
/// whether the ray passes inside or outside the circles that end the segment, each at its own
/// height, tells whether it crosses the frustum once; only where it passes outside both it may
/// cross twice. A circle gives the two frusta that share it the same answer, found from the same
/// numbers. Only the gas side is hit.
///
/// At the outer side, r = radius of the cell, rays are reflected as by a mirror: the stand-in for
/// the round cell's neighbours, which are not round about this axis. It returns what comes down
/// on the open wafer outside, so that the mask there sees the whole sky.
class FrustumCaster {
public:
    FrustumCaster(const Domain&, const Surface&, double z_open);

    /// As RayCaster::trace; the end of the ray is turned into the half-plane y = 0, x >= 0, its
    /// direction with it.
    Hit trace(const Vec3& origin, const Vec3& direction, int from_element) const;

    /// As RayCaster::opens.
    bool opens(const Vec3& origin, const Vec3& direction, int from_element) const;

private:
    struct Ray;
    struct Frustum {
        double ra, za, rb, zb;
        double ra2, rb2; ///< squared; infinite on the outer side, which no ray gets past
    };
    struct Box { ///< [nm], r squared
        double r2_low, r2_high, z_low, z_high;
    };
    struct Node { ///< children, or elements [first, last) if it has none
        std::array<Box, 2> box;
        std::array<int, 2> child;
        int first, last;
    };

    int build(int first, int last);
    Box box_of(int first, int last) const;
    void nearest(const Ray&, int from, double& way, int& element) const;
    bool cross(const Ray&, const Frustum&, double& way) const;
    double least_way(int from, int element) const;
    int hit_at_start(const Vec3& origin, const Vec3& direction, int from) const;

    double radius_, z_open_, slack_;
    double z_top_; ///< of the surface
    BoreRims rims_;
    std::vector<Frustum> frusta_;
    std::vector<std::array<int, 2>> convex_;  ///< elements that meet it in an outer edge, or -1
    std::vector<std::array<int, 2>> concave_; ///< in an inner one; on the axis itself
    std::vector<Node> nodes_;
};

} // namespace rille::geometry
