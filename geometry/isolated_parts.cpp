// SPDX-License-Identifier: Apache-2.0
#include "geometry/isolated_parts.hpp"

#include <algorithm>
#include <cmath>

namespace rille::geometry {

namespace {

constexpr double pi = 3.14159265358979323846;

/// Integrals over one chain; signs as for a solid, whose normals point outwards.
struct Moments {
    double cover = 0;     ///< of n_z dA
    double volume = 0;    ///< of z n_z dA
    Vec3 moment{0, 0, 0}; ///< of (x z, y z, z^2 / 2) n_z dA
    Vec3 reference{0, 0, 0};
    double top = -1e300;
    bool started = false;
    bool on_axis = false; ///< revolved: meets the axis
};

/// Adds a flat piece: its corners weigh alike in integrals of linear functions; products take the
/// exact rule for a segment (Simpson, exact for cubics as well: revolved needs them) and a triangle
/// (middles of the sides).
class Adder {
public:
    explicit Adder(const Domain& domain) : domain_(domain) {}

    void add(Moments& m, const Vec3& a, const Vec3& b) const {
        const double nz = b.x - a.x;
        const Vec3 points[3] = {a, (a + b) * 0.5, b};
        const double weights[3] = {1.0 / 6, 4.0 / 6, 1.0 / 6};
        collect(m, points, weights, nz);
    }
    void add(Moments& m, const Vec3& a, const Vec3& b, const Vec3& c) const {
        const double nz = 0.5 * (b - a).cross(c - a).z;
        const Vec3 points[3] = {(a + b) * 0.5, (b + c) * 0.5, (c + a) * 0.5};
        const double weights[3] = {1.0 / 3, 1.0 / 3, 1.0 / 3};
        collect(m, points, weights, nz);
    }

private:
    void collect(Moments& m, const Vec3 (&points)[3], const double (&weights)[3], double nz) const {
        if (!m.started) m.reference = points[0];
        m.started = true;
        // One offset for the whole piece: it may lie across a periodic side from the reference.
        const Vec3 offset = nearest_image(points[1] - m.reference) - (points[1] - m.reference);
        for (int n = 0; n < 3; ++n) {
            const Vec3 d = points[n] - m.reference + offset;
            const double turned = domain_.revolved() ? 2 * pi * points[n].x : 1;
            const double w = weights[n] * nz * turned;
            m.cover += w;
            m.volume += w * points[n].z;
            m.moment +=
                Vec3(d.x * points[n].z, d.y * points[n].z, 0.5 * points[n].z * points[n].z) * w;
            m.top = std::max(m.top, points[n].z);
            m.on_axis = m.on_axis || (domain_.revolved() && points[n].x == 0);
        }
    }
    Vec3 nearest_image(Vec3 d) const {
        if (domain_.sides == Sides::mirror) return d;
        d.x -= domain_.width_x() * std::round(d.x / domain_.width_x());
        if (!domain_.planar_contour())
            d.y -= domain_.width_y() * std::round(d.y / domain_.width_y());
        return d;
    }

    const Domain& domain_;
};

IsolatedPart part_of(const Moments& m, int chain) {
    IsolatedPart part;
    part.kind = m.volume > 0 ? IsolatedPart::Kind::detached_solid : IsolatedPart::Kind::closed_void;
    part.volume = std::fabs(m.volume);
    part.chain = chain;
    if (m.volume != 0) {
        const Vec3 mean = m.moment / m.volume;
        part.centre = Vec3(m.reference.x + mean.x, m.reference.y + mean.y, mean.z);
        if (m.on_axis) part.centre.x = 0;
    }
    return part;
}

} // namespace

std::vector<IsolatedPart> find_isolated_parts(const Domain& domain, const Surface& s) {
    int chains = 0;
    for (int c : s.chain)
        chains = std::max(chains, c + 1);
    std::vector<Moments> moments(chains);
    const Adder adder(domain);
    for (std::size_t e = 0; e < s.size(); ++e) {
        const auto& c = s.corners[e];
        Moments& m = moments[s.chain[e]];
        const auto vertex = [&](int n) { return s.vertices[c[n]]; };
        if (c[2] < 0) {
            adder.add(m, vertex(0), vertex(1));
            continue;
        }
        adder.add(m, vertex(0), vertex(1), vertex(2));
        if (c[3] != c[2]) adder.add(m, vertex(0), vertex(2), vertex(3));
    }

    const double base = domain.base_area();
    std::vector<int> sheets; // that span the period, from the top
    for (int c = 0; c < chains; ++c)
        if (std::fabs(moments[c].cover) > 0.5 * base) sheets.push_back(c);
    std::stable_sort(sheets.begin(), sheets.end(),
                     [&](int a, int b) { return moments[a].top > moments[b].top; });

    std::vector<IsolatedPart> parts;
    for (int c = 1; c < chains; ++c) {
        if (!moments[c].started) continue;
        const auto at = std::find(sheets.begin(), sheets.end(), c);
        if (at == sheets.end()) {
            parts.push_back(part_of(moments[c], c));
        } else if (at != sheets.begin()) {
            // Between this sheet and the one above: solid if the gas lies below this sheet.
            Moments both = moments[c];
            const Moments& above = moments[*(at - 1)];
            const Vec3 shift = above.reference - both.reference;
            both.volume += above.volume;
            both.moment += above.moment + Vec3(shift.x, shift.y, 0) * above.volume;
            parts.push_back(part_of(both, c));
        }
    }
    return parts;
}

} // namespace rille::geometry
