// SPDX-License-Identifier: Apache-2.0
// Private to geometry: smooth faces fitted to the front on either side of an edge.
#pragma once

#include "geometry/vec.hpp"

#include <array>
#include <cmath>
#include <vector>

namespace rille::geometry {

/// A point of the front with its normal, in cells, relative to the vertex at hand.
struct FaceSample {
    Vec3 point, normal;
    int face = -1;     ///< which face it belongs to; -1 none
    double trust = 1;  ///< less where the front bends strongly round it
    double near = 1;   ///< by distance from the vertex, times trust
    double weight = 1; ///< of the position
    double steady = 1; ///< of the normal
};

/// A face as height over its mean plane, second order in the plane's coordinates, so that it may be
/// followed up to the edge where it ends. Coordinates in cells, relative to the vertex at hand.
struct CurvedFace {
    Vec3 origin{0, 0, 0}, normal{0, 0, 1}, across{1, 0, 0}, along{0, 1, 0};
    std::array<double, 6> height{}; ///< 1, a, b, a^2 / 2, b^2 / 2, a b
    double weight = 0;              ///< of the samples

    /// Distance from the face, to first order; > 0 on the side of the gas.
    double value(const Vec3& p) const { return at(p).value; }
    /// Unit normal of the face next to p.
    Vec3 normal_at(const Vec3& p) const { return at(p).normal; }
    struct Place {
        double value;
        Vec3 normal;
    };
    Place at(const Vec3& p) const {
        const Vec3 d = p - origin;
        const double a = d.dot(across), b = d.dot(along);
        const double ga = height[1] + height[3] * a + height[5] * b;
        const double gb = height[2] + height[4] * b + height[5] * a;
        const double top = height[0] + 0.5 * (a * (height[1] + ga) + b * (height[2] + gb));
        const double scale = 1 / std::sqrt(1 + ga * ga + gb * gb);
        return {(d.dot(normal) - top) * scale, (normal - across * ga - along * gb) * scale};
    }
    /// Least squares over positions and normals of the samples of face `f` by their weights.
    void fit(const std::vector<FaceSample>&, int f, bool curved);
};

/// Up to three faces that meet near a vertex, as a solid: max of the faces where their edge is
/// convex, min where it is concave.
struct LocalSolid {
    std::array<CurvedFace, 3> face;
    int count = 0;

    bool convex(int a, int b) const {
        return (face[b].origin - face[a].origin).dot(face[a].normal - face[b].normal) < 0;
    }
    double value(const Vec3& p) const;
};

/// Splits samples (the vertex is at 0) into the two or three faces whose edge or corner passes near
/// the vertex. False where there is none: where the faces, each followed with its curvature, meet
/// at less than 30 degrees, or the samples do not fit.
bool find_faces(std::vector<FaceSample>& samples, LocalSolid& solid);

} // namespace rille::geometry
