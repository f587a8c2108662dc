// SPDX-License-Identifier: Apache-2.0
#include "geometry/curved_face.hpp"
#include "geometry/dual_mesh.hpp"
#include "geometry/ranges.hpp"

#include <tbb/enumerable_thread_specific.h>

#include <algorithm>
#include <cmath>

namespace rille::geometry {

namespace {

constexpr double flat_cosine = 0.978;  ///< 12 deg: quads round a vertex away from edges
constexpr double sharp_cosine = 0.906; ///< 25 deg: a vertex worth looking at
constexpr double smooth_side = 0.26;   ///< sine of 15 deg: 30 deg between a quad and its image
constexpr double bent = 0.35;          ///< [rad] turn at a quad that halves its say in a face
constexpr double turned_over = 0.2;    ///< cosine of an element that lies the wrong way
constexpr double laid_together = -0.8; ///< cosine between two elements that meet back to back
constexpr double folded_area = 0.02;   ///< [cells^2] twice the area of an element that matters
constexpr double blunted = 0.35;       ///< [cells]
constexpr double reach = 4.2;          ///< [cells] faces are fitted within

/// What a search over the mesh has come by: the vertex it started from, for each vertex and quad.
struct Seen {
    std::vector<int> vertex, quad, queue;
    Seen() = default;
    Seen(std::size_t vertices, std::size_t quads) : vertex(vertices, -1), quad(quads, -1) {}
};

class Sharpener {
public:
    Sharpener(const Band& band, DualMesh& mesh)
        : band_(band), mesh_(mesh), h_(band.domain.spacing) {}

    void run() {
        mark();
        std::vector<int> work;
        for (int v = 0; v < static_cast<int>(sharp_.size()); ++v)
            if (sharp_[v]) work.push_back(v);
        std::vector<Vec3> moved(work.size());
        tbb::enumerable_thread_specific<Seen> seen_of_thread;
        over_ranges(work.size(), 512, [&](std::size_t first, std::size_t last) {
            Seen& seen = seen_of_thread.local();
            if (seen.vertex.empty()) seen = {mesh_.position.size(), mesh_.quads.size()};
            for (std::size_t n = first; n < last; ++n)
                moved[n] = settle(work[n], seen);
        });
        const std::vector<Vec3> blunt = mesh_.position;
        for (std::size_t n = 0; n < work.size(); ++n)
            mesh_.position[work[n]] = moved[n];
        unfold(work, blunt);
    }

private:
    /// Puts vertices back where moving them turned an element over, or laid one on another: a mesh
    /// of the contour looks out of the solid along the grid edge that each element crosses.
    void unfold(const std::vector<int>& work, const std::vector<Vec3>& blunt) {
        std::vector<char> back(work.size());
        for (int round = 0; round < 4; ++round) {
            over_ranges(work.size(), 512, [&](std::size_t first, std::size_t last) {
                for (std::size_t n = first; n < last; ++n)
                    back[n] = mesh_.position[work[n]] != blunt[work[n]] && folded(work[n]);
            });
            if (std::none_of(back.begin(), back.end(), [](char b) { return b; })) return;
            for (std::size_t n = 0; n < work.size(); ++n)
                if (back[n]) mesh_.position[work[n]] = blunt[work[n]];
        }
    }

    bool folded(int v) const {
        std::array<Vec3, 12> seen;
        std::size_t count = 0;
        for (int a = mesh_.first[v]; a < mesh_.first[v + 1]; ++a) {
            const DualQuad& q = mesh_.quads[mesh_.round[a]];
            Vec3 n = across(band_.domain, mesh_, q);
            const double twice_area = n.length();
            if (!(twice_area > folded_area * h_ * h_)) continue;
            n /= twice_area;
            if ((q.up ? n[q.axis] : -n[q.axis]) < -turned_over) return true;
            for (std::size_t m = 0; m < count; ++m)
                if (n.dot(seen[m]) < laid_together) return true;
            if (count < seen.size()) seen[count++] = n;
        }
        return false;
    }

    /// One bit for each mirror side that the surface meets at a vertex without an edge between it
    /// and its image. An edge on a side is in place: vertices lie where the surface ends.
    using Meets = std::uint8_t;
    static Meets side(int axis, bool upper) { return 1 << (2 * axis + upper); }
    static bool meets_any(Meets meets, int axis) {
        return meets & (side(axis, false) | side(axis, true));
    }
    Meets met_by(int v) const {
        Meets meets = 0;
        if (band_.domain.sides != Sides::mirror) return meets;
        const DualCell& cell = mesh_.cells[mesh_.cell_of_vertex[v]];
        const auto& c = band_.cells[cell.node];
        const bool last[2] = {c.i == band_.domain.cells_x - 1, c.j == band_.domain.cells_y - 1};
        for (int axis = 0; axis < 2; ++axis)
            if ((cell.low[axis] || last[axis]) && meets_smoothly(v, axis))
                meets |= side(axis, !cell.low[axis]);
        return meets;
    }
    bool meets_smoothly(int v, int axis) const {
        return std::all_of(mesh_.round.begin() + mesh_.first[v],
                           mesh_.round.begin() + mesh_.first[v + 1],
                           [&](int n) { return std::fabs(mesh_.normal[n][axis]) < smooth_side; });
    }

    /// Between normals round a vertex, those of images in mirror sides among them.
    double least_cosine(int v) const {
        double least = 1;
        for (int a = mesh_.first[v]; a < mesh_.first[v + 1]; ++a)
            least = std::min(least, least_cosine(mesh_.normal[mesh_.round[a]], v, a + 1));
        return least;
    }
    /// Between `n` and the normals of the first quads round a vertex.
    double least_cosine(const Vec3& n, int v, int end) const {
        double least = 1;
        for (int a = mesh_.first[v]; a < end; ++a) {
            const Vec3& other = mesh_.normal[mesh_.round[a]];
            double cosine = n.z * other.z;
            for (int axis = 0; axis < 2; ++axis) {
                const double along = n[axis] * other[axis];
                cosine += meets_any(meets_[v], axis) ? -std::fabs(along) : along;
            }
            least = std::min(least, cosine);
        }
        return least;
    }

    void mark() {
        const std::size_t vertices = mesh_.position.size();
        meets_.resize(vertices);
        turn_.resize(vertices);
        trust_.resize(mesh_.quads.size());
        clean_.resize(mesh_.quads.size());
        sharp_.resize(vertices);
        over_ranges(vertices, 4096, [&](std::size_t first, std::size_t last) {
            for (std::size_t v = first; v < last; ++v) {
                meets_[v] = met_by(static_cast<int>(v));
                turn_[v] = least_cosine(static_cast<int>(v));
            }
        });
        over_ranges(mesh_.quads.size(), 4096, [&](std::size_t first, std::size_t last) {
            for (std::size_t n = first; n < last; ++n) {
                const auto& v = mesh_.quads[n].vertex;
                clean_[n] =
                    std::all_of(v.begin(), v.end(), [&](int w) { return turn_[w] > flat_cosine; });
                double least = 1;
                for (int w : v)
                    least = std::min(least, turn_[w]);
                const double turn = 2 * (1 - least) / (bent * bent); // squared
                trust_[n] = 1 / (1 + turn * turn);
            }
        });
        over_ranges(vertices, 4096, [&](std::size_t first, std::size_t last) {
            for (std::size_t v = first; v < last; ++v)
                sharp_[v] = looks_sharp(static_cast<int>(v));
        });
    }

    /// Normals within two rings of quads that turn by more than 25 degrees, not all cleanly.
    bool looks_sharp(int v) const {
        bool all_clean = true;
        for (int a = mesh_.first[v]; a < mesh_.first[v + 1]; ++a)
            all_clean = all_clean && clean_[mesh_.round[a]];
        if (all_clean) return false;
        const Vec3& n = mesh_.normal[mesh_.round[mesh_.first[v]]];
        double least = turn_[v];
        for (int a = mesh_.first[v]; a < mesh_.first[v + 1]; ++a)
            for (int w : mesh_.quads[mesh_.round[a]].vertex)
                least = std::min(least, least_cosine(n, w, mesh_.first[w + 1]));
        return least < sharp_cosine;
    }

    /// Quads within `reach` of vertex v, reached over the surface, and their images in the mirror
    /// sides that the surface meets there.
    std::vector<FaceSample> samples_near(int v, Seen& seen) const {
        std::vector<FaceSample> samples;
        samples.reserve(96);
        seen.queue.assign(1, v);
        const Vec3 here = mesh_.position[v];
        const double most = reach * reach * h_ * h_;
        Meets meets = 0;
        seen.vertex[v] = v;
        for (std::size_t at = 0; at < seen.queue.size(); ++at) {
            const int from = seen.queue[at];
            meets |= meets_[from];
            for (int a = mesh_.first[from]; a < mesh_.first[from + 1]; ++a) {
                const int n = mesh_.round[a];
                if (seen.quad[n] == v) continue;
                seen.quad[n] = v;
                for (int w : mesh_.quads[n].vertex) {
                    if (seen.vertex[w] == v) continue;
                    seen.vertex[w] = v;
                    if (between(band_.domain, here, mesh_.position[w]).length2() < most)
                        seen.queue.push_back(w);
                }
                const Vec3 apart = between(band_.domain, here, mesh_.crossing[n]);
                if (apart.length2() > most || mesh_.normal[n].length2() < 0.5) continue;
                FaceSample s;
                s.point = apart / h_;
                s.normal = mesh_.normal[n];
                s.trust = trust_[n];
                samples.push_back(s);
            }
        }
        for (int axis = 0; axis < 2; ++axis)
            for (const bool upper : {false, true})
                if (meets & side(axis, upper)) add_images(axis, upper, here, samples);
        return samples;
    }

    void add_images(int axis, bool upper, const Vec3& here,
                    std::vector<FaceSample>& samples) const {
        const Domain& d = band_.domain;
        const double width = axis == 0 ? d.width_x() : d.width_y();
        const double plane = ((upper ? 0.5 : -0.5) * width - here[axis]) / h_;
        for (std::size_t n = 0, count = samples.size(); n < count; ++n) {
            FaceSample s = samples[n];
            s.point[axis] = 2 * plane - s.point[axis];
            s.normal[axis] = -s.normal[axis];
            if (s.point.length2() <= reach * reach) samples.push_back(s);
        }
    }

    /// Crossings of the cell's edges with the fitted solid; `touched` tells which faces they lie
    /// on.
    static Vec3 recross(const CrossedCell& cell, const Vec3& here, double h,
                        const LocalSolid& solid, bool (&touched)[3]) {
        Vec3 sum(0, 0, 0);
        for (int n = 0; n < cell.count; ++n) {
            const Vec3 a = (cell.edge[n].a - here) / h, b = (cell.edge[n].b - here) / h;
            Vec3 best = (cell.edge[n].crossing - here) / h;
            double best_value = 1e300;
            int best_face = -1;
            for (int f = 0; f < solid.count; ++f) {
                const double va = solid.face[f].value(a), vb = solid.face[f].value(b);
                if (std::fabs(va - vb) < 1e-9) continue;
                double t = va / (va - vb);
                t -= solid.face[f].value(a + (b - a) * t) / (vb - va); // it may be curved
                if (t < -1.5 || t > 2.5 ||
                    (!cell.on_side[0] && !cell.on_side[1] && (t < -0.1 || t > 1.1)))
                    continue;
                const Vec3 p = a + (b - a) * t;
                const double value = std::fabs(solid.value(p));
                if (value < best_value - 1e-9) {
                    best_value = value;
                    best = p;
                    best_face = f;
                }
            }
            if (best_face >= 0) touched[best_face] = true;
            sum += best;
        }
        return sum / cell.count;
    }

    /// The point nearest to `start` on all touched faces, staying on the side planes.
    static Vec3 meet(const Vec3& start, const LocalSolid& solid, const bool (&touched)[3],
                     const std::array<bool, 3>& on_side) {
        Vec3 base = start;
        for (int round = 0; round < 3; ++round)
            base = meet_tangents(start, base, solid, touched, on_side);
        return base;
    }

    /// The same on the planes that touch the faces next to `base`.
    static Vec3 meet_tangents(const Vec3& start, const Vec3& base, const LocalSolid& solid,
                              const bool (&touched)[3], const std::array<bool, 3>& on_side) {
        Vec3 p = start;
        std::array<Vec3, 3> basis; // orthonormal, by Gram and Schmidt
        int size = 0;
        for (int f = 0; f < solid.count; ++f) {
            if (!touched[f]) continue;
            const Vec3 tangent = solid.face[f].normal_at(base);
            Vec3 n = tangent;
            for (int axis = 0; axis < 2; ++axis)
                if (on_side[axis]) n[axis] = 0;
            for (int b = 0; b < size; ++b)
                n -= basis[b] * basis[b].dot(n);
            const double length = n.length();
            if (length < 0.15) continue; // nearly parallel: adds no information
            n /= length;
            // Moving along n leaves the earlier faces; step until face f is met.
            const double value = solid.face[f].value(base) + tangent.dot(p - base);
            p -= n * (value / n.dot(tangent));
            basis[size++] = n;
        }
        return p;
    }

    Vec3 settle(int v, Seen& seen) const {
        const Vec3 here = mesh_.position[v];
        std::vector<FaceSample> samples = samples_near(v, seen);
        LocalSolid solid;
        if (!find_faces(samples, solid)) return here;
        // The mean of the crossings lies this near to one of two faces, or they are not there.
        if (solid.count == 2 && std::fabs(solid.value(Vec3(0))) > blunted) return here;
        const CrossedCell cell = crossed_cell(band_, mesh_, v);
        bool touched[3] = {};
        const Vec3 start = recross(cell, here, h_, solid, touched);
        const Vec3 p = meet(start, solid, touched, cell.on_side) * h_ + here;
        for (int axis = 0; axis < 3; ++axis) {
            if (cell.on_side[axis]) continue;
            const double slack = (cell.on_side[0] || cell.on_side[1] ? 2.0 : 0.3) * h_;
            if (p[axis] < cell.low[axis] - slack || p[axis] > cell.high[axis] + slack) return here;
        }
        Vec3 q = p;
        for (int axis = 0; axis < 2; ++axis)
            if (cell.on_side[axis]) q[axis] = here[axis];
        return q;
    }

    const Band& band_;
    DualMesh& mesh_;
    double h_;
    std::vector<Meets> meets_;         ///< of a vertex
    std::vector<double> turn_, trust_; ///< least cosine round a vertex; of a quad for a face
    std::vector<char> clean_, sharp_;
};

} // namespace

void sharpen(const Band& band, DualMesh& mesh) {
    if (!mesh.quads.empty()) Sharpener(band, mesh).run();
}

} // namespace rille::geometry
