// SPDX-License-Identifier: Apache-2.0
// Plain forward random walks of neutrals: launched from the source plane by the cosine law,
// absorbed with the sticking probability, else re-emitted diffusely. Nothing in common with the
// exchange operator but the ray caster.
#pragma once

#include "geometry/domain.hpp"
#include "geometry/ray_caster.hpp"
#include "geometry/surface.hpp"

#include <tbb/parallel_for.h>

#include <cmath>
#include <cstdint>
#include <random>
#include <vector>

namespace rille::tests {

/// Impinging flux relative to the open flux, per bin, with standard errors.
struct WalkResult {
    std::vector<double> flux, error;
    double escaped = 0; ///< share of the walkers
    double absorbed = 0;
    double lost = 0;
};

struct WalkOptions {
    int walkers = 100000;
    std::uint64_t seed = 1;
    double emission_power = 1; ///< cos^n law of re-emission; anything but 1 is a fault
};

/// `bin[e]` of each element, or -1. Of each walker one hit, chosen at random, is tallied with the
/// weight of all its hits: unbiased, and bins are almost independent of each other.
inline WalkResult forward_walk(const geometry::Domain& domain, const geometry::Surface& surface,
                               const geometry::RayCaster& caster,
                               const std::vector<double>& sticking, const std::vector<int>& bin,
                               int bins, const WalkOptions& options) {
    using geometry::Hit;
    using geometry::Vec3;
    constexpr int chunks = 64;
    struct Chunk {
        std::vector<double> sum, squares;
        double escaped = 0, absorbed = 0, lost = 0;
    };
    std::vector<Chunk> chunk(chunks);
    const auto cosine = [](std::mt19937_64& random, const Vec3& n, double power) {
        std::uniform_real_distribution<double> u(0, 1);
        const double c = std::pow(1 - u(random), 1 / (power + 1)), s = std::sqrt(1 - c * c);
        const double a = 2 * std::acos(-1.0) * u(random);
        const Vec3 t = (std::fabs(n.y) < 0.5 ? Vec3(0, 1, 0) : Vec3(1, 0, 0)).cross(n).normalized();
        return (t * (s * std::cos(a)) + n.cross(t) * (s * std::sin(a)) + n * c).normalized();
    };
    const int per_chunk = options.walkers / chunks;
    tbb::parallel_for(0, chunks, [&](int k) {
        std::mt19937_64 random(options.seed * 1000003 + k);
        std::uniform_real_distribution<double> u(0, 1);
        Chunk& out = chunk[k];
        out.sum.assign(bins, 0), out.squares.assign(bins, 0);
        for (int w = 0; w < per_chunk; ++w) {
            Vec3 p(domain.x_min() + u(random) * domain.width_x(),
                   domain.planar_contour() ? 0 : domain.y_min() + u(random) * domain.width_y(),
                   caster.z_open() - 1e-9);
            if (domain.revolved()) p.x = std::sqrt(p.x * domain.width_x()); // even over the disc
            Hit hit = caster.trace(p, cosine(random, {0, 0, -1}, 1), -1);
            int hits = 0, chosen = -1;
            while (hit.kind == Hit::Kind::surface) {
                if (u(random) * ++hits < 1) chosen = bin[hit.element];
                if (u(random) < sticking[hit.element]) break;
                const Vec3 d = cosine(random, surface.normal[hit.element], options.emission_power);
                hit = caster.trace(hit.point, d, hit.element);
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
    const double source = domain.base_area();
    for (int b = 0; b < bins; ++b) {
        const double scale = source / area[b], mean = sum[b] / walkers;
        r.flux.push_back(scale * mean);
        r.error.push_back(scale * std::sqrt((squares[b] / walkers - mean * mean) / walkers));
    }
    return r;
}

/// Bins of about equal area along the order of the elements, for elements below z_top.
inline std::vector<int> bins_below(const geometry::Surface& s, double z_top, int bins) {
    double total = 0, along = 0;
    for (std::size_t e = 0; e < s.size(); ++e)
        if (s.centre[e].z < z_top) total += s.area[e];
    std::vector<int> bin(s.size(), -1);
    for (std::size_t e = 0; e < s.size(); ++e)
        if (s.centre[e].z < z_top) {
            bin[e] = std::min(bins - 1, int((along + 0.5 * s.area[e]) / total * bins));
            along += s.area[e];
        }
    return bin;
}

} // namespace rille::tests
