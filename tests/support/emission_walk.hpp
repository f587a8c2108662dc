// SPDX-License-Identifier: Apache-2.0
// Plain forward random walks of what a surface gives off: launched from the elements by the law
// cos^n, absorbed with the sticking probability, else re-emitted by the cosine law. Nothing in
// common with the exchange operator but the ray caster.
#pragma once

#include "fluxes/launch.hpp"
#include "tests/support/forward_walk.hpp"

#include <algorithm>
#include <numeric>

namespace rille::tests {

/// Impinging flux per bin, with standard errors, in the units of `emitted`; shares of the walkers.
/// options.emission_power is the n of the first flight.
inline WalkResult emission_walk(const geometry::Domain& domain, const geometry::Surface& surface,
                                const geometry::RayCaster& caster,
                                const std::vector<double>& emitted,
                                const std::vector<double>& sticking, const std::vector<int>& bin,
                                int bins, const WalkOptions& options) {
    using geometry::Hit;
    using geometry::Vec3;
    constexpr int chunks = 64;
    std::vector<double> up_to(surface.size());
    for (std::size_t e = 0; e < surface.size(); ++e)
        up_to[e] = (e > 0 ? up_to[e - 1] : 0) + surface.area[e] * emitted[e];
    struct Chunk {
        std::vector<double> sum, squares;
        double escaped = 0, absorbed = 0, lost = 0;
    };
    std::vector<Chunk> chunk(chunks);
    const int per_chunk = options.walkers / chunks;
    tbb::parallel_for(0, chunks, [&](int k) {
        std::mt19937_64 random(options.seed * 1000003 + k);
        std::uniform_real_distribution<double> u(0, 1);
        const auto about = [&](const Vec3& n, double power) {
            const double c = std::pow(1 - u(random), 1 / (power + 1)), s = std::sqrt(1 - c * c);
            const double a = 2 * std::acos(-1.0) * u(random);
            const Vec3 t =
                (std::fabs(n.y) < 0.5 ? Vec3(0, 1, 0) : Vec3(1, 0, 0)).cross(n).normalized();
            return (t * (s * std::cos(a)) + n.cross(t) * (s * std::sin(a)) + n * c).normalized();
        };
        Chunk& out = chunk[k];
        out.sum.assign(bins, 0), out.squares.assign(bins, 0);
        for (int w = 0; w < per_chunk; ++w) {
            const auto from =
                std::lower_bound(up_to.begin(), up_to.end(), u(random) * up_to.back());
            const int e = int(from - up_to.begin());
            fluxes::Launch start = fluxes::launch_from(surface, e, u(random), u(random));
            if (domain.extruded()) {
                const Vec3 a = surface.vertices[surface.corners[e][0]];
                const Vec3 b = surface.vertices[surface.corners[e][1]];
                start.point = a + (b - a) * u(random);
            }
            Hit hit = caster.trace(start.point, about(start.normal, options.emission_power), e);
            int hits = 0, chosen = -1;
            while (hit.kind == Hit::Kind::surface) {
                if (u(random) * ++hits < 1) chosen = bin[hit.element];
                if (u(random) < sticking[hit.element]) break;
                hit = caster.trace(hit.point, about(surface.normal[hit.element], 1), hit.element);
            }
            out.escaped += hit.kind == Hit::Kind::open;
            out.absorbed += hit.kind == Hit::Kind::surface;
            out.lost += hit.kind == Hit::Kind::lost;
            if (chosen >= 0) out.sum[chosen] += hits, out.squares[chosen] += double(hits) * hits;
        }
    });
    std::vector<double> area(bins, 0), sum(bins, 0), squares(bins, 0);
    for (std::size_t e = 0; e < surface.size(); ++e)
        if (bin[e] >= 0) area[bin[e]] += surface.area[e];
    WalkResult r;
    const double walkers = double(per_chunk) * chunks;
    for (const Chunk& c : chunk) {
        r.escaped += c.escaped / walkers, r.absorbed += c.absorbed / walkers;
        r.lost += c.lost / walkers;
        for (int b = 0; b < bins; ++b)
            sum[b] += c.sum[b], squares[b] += c.squares[b];
    }
    for (int b = 0; b < bins; ++b) {
        const double scale = up_to.back() / area[b], mean = sum[b] / walkers;
        r.flux.push_back(scale * mean);
        r.error.push_back(scale * std::sqrt((squares[b] / walkers - mean * mean) / walkers));
    }
    return r;
}

} // namespace rille::tests
