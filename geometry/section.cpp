// SPDX-License-Identifier: Apache-2.0
#include "geometry/section.hpp"

#include "geometry/check.hpp"

#include <algorithm>
#include <cmath>

namespace rille::geometry {

namespace {

/// Point of the edge between two vertices on the plane where coordinate `across` is `plane`; the
/// same bits from either of the faces that share the edge.
Vec3 on_plane(const Surface& s, int from, int to, int across, double plane) {
    if (from > to) std::swap(from, to);
    const Vec3 &a = s.vertices[from], &b = s.vertices[to];
    const double share = (plane - a[across]) / (b[across] - a[across]);
    return a + share * (b - a);
}

/// Image of a piece about u = 0, the gas on its left again.
Section::Piece mirrored(const Section::Piece& p) {
    return {-p.u1, p.z1, -p.u0, p.z0, -p.normal_u, p.normal_z, p.element, p.chain};
}

} // namespace

Section::Section(const Domain& domain, const Surface& surface, int axis, double plane,
                 double centre, double width)
    : centre_(centre), width_(width) {
    std::vector<Piece> own;
    if (domain.planar_contour()) {
        RILLE_CHECK(axis == 0 || domain.revolved(), "an extruded surface has no section along y");
        for (std::size_t e = 0; e < surface.size(); ++e) {
            const Vec3 &a = surface.vertices[surface.corners[e][0]],
                       &b = surface.vertices[surface.corners[e][1]];
            const Vec3& n = surface.normal[e];
            own.push_back({a.x, a.z, b.x, b.z, n.x, n.z, static_cast<int>(e), surface.chain[e]});
        }
    } else {
        // The plane is folded into the period and kept off its sides.
        const double across = axis == 0 ? domain.width_y() : domain.width_x();
        const double image = std::floor(plane / across + 0.5);
        plane -= image * across;
        if (domain.sides == Sides::mirror && std::fmod(image, 2.0) != 0) plane = -plane;
        const double most = 0.5 * across - 1e-9 * domain.spacing;
        cut(surface, axis, std::clamp(plane, -most, most), own);
    }
    if (domain.revolved()) { // the section through the axis: the contour and its mirror image
        for (const Piece& p : own)
            pieces_.push_back(mirrored(p));
        pieces_.insert(pieces_.end(), own.begin(), own.end());
        return;
    }
    const double period = axis == 0 ? domain.width_x() : domain.width_y();
    for (const Piece& p : own)
        add(domain, p, period);
}

/// Adds the images of one piece within a period of the axis.
void Section::add(const Domain& domain, const Piece& in_period, double period) {
    const int middle = static_cast<int>(std::floor(centre_ / period + 0.5));
    for (int image = middle - 2; image <= middle + 2; ++image) {
        const bool turned = domain.sides == Sides::mirror && image % 2 != 0;
        Piece p = turned ? mirrored(in_period) : in_period;
        p.u0 += image * period;
        p.u1 += image * period;
        if (std::max(p.u0, p.u1) >= centre_ - period && std::min(p.u0, p.u1) <= centre_ + period)
            pieces_.push_back(p);
    }
}

/// Cuts both halves of every quad (0 1 3 and 2 3 1).
void Section::cut(const Surface& s, int axis, double plane, std::vector<Piece>& out) const {
    const int across = 1 - axis;
    for (std::size_t e = 0; e < s.size(); ++e) {
        const auto& q = s.corners[e];
        int above = 0;
        for (const int v : q)
            above += s.vertices[v][across] >= plane;
        if (above == 0 || above == 4) continue;
        for (const auto& half : {std::array<int, 3>{q[0], q[1], q[3]}, {q[2], q[3], q[1]}}) {
            std::array<Vec3, 2> ends;
            int found = 0;
            for (int k = 0; k < 3 && found < 2; ++k) {
                const int v = half[k], w = half[(k + 1) % 3];
                if ((s.vertices[v][across] >= plane) != (s.vertices[w][across] >= plane))
                    ends[found++] = on_plane(s, v, w, across, plane);
            }
            const Vec3 face = (s.vertices[half[1]] - s.vertices[half[0]])
                                  .cross(s.vertices[half[2]] - s.vertices[half[0]]);
            if (found < 2 || face.length() == 0) continue;
            const Vec3 n = face.normalized();
            Vec3 along = ends[1] - ends[0];
            if (-along.z * n[axis] + along[axis] * n.z < 0) {
                std::swap(ends[0], ends[1]);
                along = -along;
            }
            if (along.length() == 0) continue;
            out.push_back({ends[0][axis], ends[0].z, ends[1][axis], ends[1].z, n[axis], n.z,
                           static_cast<int>(e), s.chain[e]});
        }
    }
}

std::vector<Section::Crossing> Section::level(double z, Side side) const {
    std::vector<Crossing> found;
    const auto above = [&](double w) { return side == Side::from_above ? w > z : w >= z; };
    for (const Piece& p : pieces_)
        if (above(p.z0) != above(p.z1)) {
            const double share = (z - p.z0) / (p.z1 - p.z0);
            found.push_back({p.u0 + share * (p.u1 - p.u0), z, &p});
        }
    std::stable_sort(found.begin(), found.end(),
                     [](const Crossing& a, const Crossing& b) { return a.u < b.u; });
    return found;
}

std::optional<Section::Gap> Section::gap_at(double z, Side side) const {
    const std::vector<Crossing> walls = level(z, side);
    std::optional<Gap> best;
    double best_share = 0;
    for (std::size_t i = 1; i < walls.size(); ++i) {
        const Gap gap{walls[i - 1], walls[i]};
        // The gas lies on the left of the walk: the left wall is walked down, the right one up.
        if (gap.left.piece->z1 > gap.left.piece->z0 || gap.right.piece->z1 < gap.right.piece->z0)
            continue;
        if (gap.left.u < centre_ && centre_ < gap.right.u) return gap;
        const double share = std::min(gap.right.u, centre_ + 0.5 * width_) -
                             std::max(gap.left.u, centre_ - 0.5 * width_);
        if (share > best_share) {
            best_share = share;
            best = gap;
        }
    }
    return best;
}

std::optional<Section::Crossing> Section::floor_below(double u, double z_from) const {
    std::optional<Crossing> best;
    for (const Piece& p : pieces_) {
        if (p.u1 <= p.u0 || (p.u0 > u) == (p.u1 > u)) continue;
        const double z = p.z0 + (u - p.u0) / (p.u1 - p.u0) * (p.z1 - p.z0);
        if (z <= z_from && (!best || z > best->z)) best = Crossing{u, z, &p};
    }
    return best;
}

} // namespace rille::geometry
