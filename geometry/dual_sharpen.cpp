// SPDX-License-Identifier: Apache-2.0
#include "geometry/dual_mesh.hpp"
#include "geometry/ranges.hpp"

#include <algorithm>
#include <cmath>

namespace rille::geometry {

namespace {

constexpr double flat_cosine = 0.978;  ///< 12 deg: quads round a vertex away from edges
constexpr double sharp_cosine = 0.906; ///< 25 deg: a vertex worth looking at
constexpr double edge_cosine = 0.866;  ///< 30 deg between one-sided normals: an edge
constexpr double third_cosine = 0.707; ///< 45 deg to both faces of an edge: a third face
constexpr double reach = 4.6;          ///< [cells] faces are fitted within
constexpr double undisturbed = 1.8;    ///< [cells] of an element's centre from the other face
constexpr double lateral = 0.8;        ///< [cells] weight along an edge: it may be curved

/// What a fit must show before it counts as an edge.
struct Demands {
    double least_weight;   ///< undisturbed elements that a face needs
    double largest_spread; ///< of the angle between faces; more is a round surface
};
constexpr Demands drawn{1e-9, 0.35}, etched{1.0, 0.10};

/// A fitted face; `point` relative to the vertex at hand, in cells.
struct Face {
    Vec3 point{0, 0, 0}, normal{0, 0, 0};
    double weight = 0;
    double value(const Vec3& p) const { return normal.dot(p - point); }
};

struct Sample {
    Vec3 point, normal;
    int face = 0;
    double weight = 1;
};

/// Up to three faces that meet near a vertex, as a solid: max of the faces where their edge is
/// convex, min where it is concave.
struct LocalSolid {
    std::array<Face, 3> face;
    int count = 0;

    bool convex(int a, int b) const {
        return (face[b].point - face[a].point).dot(face[a].normal - face[b].normal) < 0;
    }
    double value(const Vec3& p) const {
        const double f0 = face[0].value(p), f1 = face[1].value(p);
        if (count == 2) return convex(0, 1) ? std::max(f0, f1) : std::min(f0, f1);
        const double f[3] = {f0, f1, face[2].value(p)};
        const bool c01 = convex(0, 1), c02 = convex(0, 2), c12 = convex(1, 2);
        const int convex_pairs = c01 + c02 + c12;
        if (convex_pairs == 3) return std::max({f[0], f[1], f[2]});
        if (convex_pairs == 0) return std::min({f[0], f[1], f[2]});
        // The odd pair belongs together; the third face meets both in the other way.
        const bool odd = convex_pairs == 1;
        const int alone = c12 == odd ? 0 : c02 == odd ? 1 : 2;
        const double a = f[(alone + 1) % 3], b = f[(alone + 2) % 3];
        return odd ? std::min(f[alone], std::max(a, b)) : std::max(f[alone], std::min(a, b));
    }
};

class Sharpener {
public:
    Sharpener(const Band& band, DualMesh& mesh, const Demands& demands)
        : demands_(demands), band_(band), mesh_(mesh), h_(band.domain.spacing),
          periodic_(band.domain.sides == Sides::periodic) {}

    void run() {
        measure_quads();
        link();
        mark();
        std::vector<int> work;
        for (int v = 0; v < static_cast<int>(sharp_.size()); ++v)
            if (sharp_[v]) work.push_back(v);
        std::vector<Vec3> moved(work.size());
        over_ranges(work.size(), 512, [&](std::size_t first, std::size_t last) {
            std::vector<int> stamp(mesh_.position.size(), -1);
            for (std::size_t n = first; n < last; ++n)
                moved[n] = settle(work[n], stamp);
        });
        for (std::size_t n = 0; n < work.size(); ++n)
            mesh_.position[work[n]] = moved[n];
    }

private:
    Vec3 corner(const DualQuad& q, int m) const {
        Vec3 p = mesh_.position[q.vertex[m]];
        if (q.image[m] & 1) p.x -= band_.domain.width_x();
        if (q.image[m] & 2) p.y -= band_.domain.width_y();
        return p;
    }

    /// b - a, through the nearest image in a periodic domain.
    Vec3 between(const Vec3& a, const Vec3& b) const {
        Vec3 d = b - a;
        if (periodic_) {
            d.x -= band_.domain.width_x() * std::round(d.x / band_.domain.width_x());
            d.y -= band_.domain.width_y() * std::round(d.y / band_.domain.width_y());
        }
        return d;
    }

    void measure_quads() {
        centre_.resize(mesh_.quads.size());
        normal_.resize(mesh_.quads.size());
        over_ranges(mesh_.quads.size(), 4096, [&](std::size_t first, std::size_t last) {
            for (std::size_t n = first; n < last; ++n) {
                const DualQuad& q = mesh_.quads[n];
                const Vec3 a = corner(q, 0), b = corner(q, 1), c = corner(q, 2), d = corner(q, 3);
                centre_[n] = (a + b + c + d) * 0.25;
                const Vec3 cross = (c - a).cross(d - b);
                const double length = cross.length();
                normal_[n] = length > 1e-12 * h_ * h_ ? cross / length : Vec3(0, 0, 0);
            }
        });
    }

    /// Quads round each vertex.
    void link() {
        first_.assign(mesh_.position.size() + 1, 0);
        for (const DualQuad& q : mesh_.quads)
            for (int v : q.vertex)
                ++first_[v + 1];
        for (std::size_t v = 1; v < first_.size(); ++v)
            first_[v] += first_[v - 1];
        round_.resize(first_.back());
        std::vector<int> fill(first_.begin(), first_.end() - 1);
        for (std::size_t n = 0; n < mesh_.quads.size(); ++n)
            for (int v : mesh_.quads[n].vertex)
                round_[fill[v]++] = static_cast<int>(n);
    }

    double least_cosine(int v) const {
        double least = 1;
        for (int a = first_[v]; a < first_[v + 1]; ++a)
            for (int b = first_[v]; b < a; ++b)
                least = std::min(least, normal_[round_[a]].dot(normal_[round_[b]]));
        return least;
    }

    void mark() {
        const std::size_t vertices = mesh_.position.size();
        flat_.resize(vertices);
        clean_.resize(mesh_.quads.size());
        sharp_.resize(vertices);
        over_ranges(vertices, 4096, [&](std::size_t first, std::size_t last) {
            for (std::size_t v = first; v < last; ++v)
                flat_[v] = least_cosine(static_cast<int>(v)) > flat_cosine;
        });
        over_ranges(mesh_.quads.size(), 4096, [&](std::size_t first, std::size_t last) {
            for (std::size_t n = first; n < last; ++n) {
                const auto& v = mesh_.quads[n].vertex;
                clean_[n] = flat_[v[0]] && flat_[v[1]] && flat_[v[2]] && flat_[v[3]];
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
        for (int a = first_[v]; a < first_[v + 1]; ++a)
            all_clean = all_clean && clean_[round_[a]];
        if (all_clean) return false;
        const Vec3& n = normal_[round_[first_[v]]];
        double least = least_cosine(v);
        for (int a = first_[v]; a < first_[v + 1]; ++a)
            for (int w : mesh_.quads[round_[a]].vertex)
                for (int b = first_[w]; b < first_[w + 1]; ++b)
                    least = std::min(least, n.dot(normal_[round_[b]]));
        return least < sharp_cosine;
    }

    /// Clean quads within `reach` of vertex v, reached over the surface.
    std::vector<Sample> samples_near(int v, std::vector<int>& stamp) const {
        std::vector<Sample> samples;
        std::vector<int> queue{v}, seen_quads;
        const Vec3 here = mesh_.position[v];
        stamp[v] = v;
        for (std::size_t at = 0; at < queue.size(); ++at)
            for (int a = first_[queue[at]]; a < first_[queue[at] + 1]; ++a) {
                const int n = round_[a];
                if (clean_[n] &&
                    std::find(mesh_.quads[n].vertex.begin(), mesh_.quads[n].vertex.end(),
                              queue[at]) == mesh_.quads[n].vertex.begin()) {
                    const Vec3 p = between(here, centre_[n]) / h_;
                    if (p.length() < reach) samples.push_back({p, normal_[n]});
                }
                for (int w : mesh_.quads[n].vertex) {
                    if (stamp[w] == v) continue;
                    stamp[w] = v;
                    if (between(here, mesh_.position[w]).length() < reach * h_) queue.push_back(w);
                }
            }
        return samples;
    }

    static void fit(std::vector<Sample>& samples, LocalSolid& solid) {
        for (int f = 0; f < solid.count; ++f) {
            Face& face = solid.face[f];
            Vec3 point(0, 0, 0), normal(0, 0, 0);
            double weight = 0;
            for (const Sample& s : samples) {
                if (s.face != f) continue;
                point += s.point * s.weight;
                normal += s.normal * s.weight;
                weight += s.weight;
            }
            face.weight = weight;
            if (!(weight > 0)) continue;
            face.point = point / weight;
            face.normal = normal.normalized();
        }
    }

    /// Splits the samples into two or three faces; false where the surface is smooth or round.
    bool find_faces(std::vector<Sample>& samples, LocalSolid& solid) const {
        if (samples.size() < 3) return false;
        int seed[3] = {0, 0, -1};
        double least = 1;
        for (std::size_t a = 0; a < samples.size(); ++a)
            for (std::size_t b = a + 1; b < samples.size(); ++b) {
                const double cosine = samples[a].normal.dot(samples[b].normal);
                if (cosine < least - 1e-9) {
                    least = cosine;
                    seed[0] = static_cast<int>(a);
                    seed[1] = static_cast<int>(b);
                }
            }
        if (least > edge_cosine) return false;
        double best = third_cosine;
        for (std::size_t c = 0; c < samples.size(); ++c) {
            const double cosine = std::max(samples[c].normal.dot(samples[seed[0]].normal),
                                           samples[c].normal.dot(samples[seed[1]].normal));
            if (cosine < best - 1e-9) {
                best = cosine;
                seed[2] = static_cast<int>(c);
            }
        }
        // A curved face may look like two: then try without the third.
        return (seed[2] >= 0 && split(samples, seed, 3, solid)) || split(samples, seed, 2, solid);
    }

    /// Weights against what disturbs a fit: the other face, within the reach of its bend in phi,
    /// and the curvature of the edge.
    static void weigh(std::vector<Sample>& samples, const LocalSolid& solid) {
        const Vec3 along = solid.face[0].normal.cross(solid.face[1].normal).normalized();
        for (Sample& s : samples) {
            double away = undisturbed;
            for (int f = 0; f < solid.count; ++f)
                if (f != s.face) away = std::min(away, std::fabs(solid.face[f].value(s.point)));
            s.weight = std::pow(away / undisturbed, 8);
            if (solid.count > 2) continue;
            const double aside = s.point.dot(along) / lateral;
            s.weight *= std::exp(-0.5 * aside * aside);
        }
    }

    bool split(std::vector<Sample>& samples, const int (&seed)[3], int count,
               LocalSolid& solid) const {
        solid.count = count;
        for (Sample& s : samples) {
            double nearest = -2;
            s.weight = 1;
            for (int f = 0; f < count; ++f) {
                const double cosine = s.normal.dot(samples[seed[f]].normal);
                if (cosine > nearest) {
                    nearest = cosine;
                    s.face = f;
                }
            }
        }
        fit(samples, solid);
        for (int round = 0; round < 2; ++round) {
            weigh(samples, solid);
            fit(samples, solid);
        }
        return distinct(samples, solid);
    }

    bool distinct(const std::vector<Sample>& samples, const LocalSolid& solid) const {
        double angle = 4;
        for (int a = 0; a < solid.count; ++a)
            for (int b = 0; b < a; ++b)
                angle = std::min(
                    angle,
                    std::acos(std::clamp(solid.face[a].normal.dot(solid.face[b].normal), -1., 1.)));
        if (angle < std::acos(edge_cosine)) return false;
        for (const Sample& s : samples) {
            const double cosine = s.normal.dot(solid.face[s.face].normal);
            if (s.weight > 0.1 && cosine < std::cos(demands_.largest_spread * angle)) return false;
        }
        for (int f = 0; f < solid.count; ++f)
            if (!(solid.face[f].weight > demands_.least_weight)) return false;
        return true;
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
                const double t = va / (va - vb);
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
        Vec3 p = start;
        std::array<Vec3, 3> basis; // orthonormal, by Gram and Schmidt
        int size = 0;
        for (int f = 0; f < solid.count; ++f) {
            if (!touched[f]) continue;
            Vec3 n = solid.face[f].normal;
            for (int axis = 0; axis < 2; ++axis)
                if (on_side[axis]) n[axis] = 0;
            for (int b = 0; b < size; ++b)
                n -= basis[b] * basis[b].dot(n);
            const double length = n.length();
            if (length < 0.15) continue; // nearly parallel: adds no information
            n /= length;
            // Moving along n leaves the earlier faces; step until face f is met.
            p -= n * (solid.face[f].value(p) / n.dot(solid.face[f].normal));
            basis[size++] = n;
        }
        return p;
    }

    Vec3 settle(int v, std::vector<int>& stamp) const {
        const Vec3 here = mesh_.position[v];
        std::vector<Sample> samples = samples_near(v, stamp);
        LocalSolid solid;
        if (!find_faces(samples, solid)) return here;
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

    const Demands demands_;
    const Band& band_;
    DualMesh& mesh_;
    double h_;
    bool periodic_;
    std::vector<Vec3> centre_, normal_;
    std::vector<int> first_, round_;
    std::vector<char> flat_, clean_, sharp_;
};

} // namespace

void sharpen(const Band& band, DualMesh& mesh, Edges edges) {
    if (!mesh.quads.empty()) Sharpener(band, mesh, edges == Edges::drawn ? drawn : etched).run();
}

} // namespace rille::geometry
