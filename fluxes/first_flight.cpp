// SPDX-License-Identifier: Apache-2.0
#include "fluxes/first_flight.hpp"

#include "fluxes/exchange_operator.hpp"
#include "fluxes/launch.hpp"
#include "fluxes/sampling.hpp"
#include "geometry/check.hpp"

#include <tbb/blocked_range.h>
#include <tbb/parallel_for.h>

#include <algorithm>
#include <cmath>

namespace rille::fluxes {
namespace {

using geometry::Hit;
using geometry::Vec3;

constexpr double pi = 3.14159265358979323846;
constexpr std::uint64_t stream_name = 0x666c69676874ULL; // keeps these streams apart from others

struct Departure {
    Vec3 from, towards;
};

/// Ray `r` from an element by the cosine law; extruded: its projection onto the plane.
Departure depart(const geometry::Domain& domain, const geometry::Surface& surface, int element,
                 const ScrambledPoints& stream, int r) {
    const auto u = stream.pair(r, 0);
    if (!domain.extruded()) {
        const auto v = stream.pair(r, 1);
        const Launch start = launch_from(surface, element, v[0], v[1]);
        return {start.point, cosine_direction(start.normal, u[0], u[1])};
    }
    const Vec3 a = surface.vertices[surface.corners[element][0]];
    const Vec3 b = surface.vertices[surface.corners[element][1]];
    const double psi = std::atan2(surface.normal[element].x, surface.normal[element].z);
    const double phi = psi + std::asin(std::clamp(2 * (u[1] + 1e-12) - 1, -1.0, 1.0));
    return {a + (b - a) * u[0], {std::sin(phi), 0, std::cos(phi)}};
}

} // namespace

double emission_weight(double n, double cosine, bool in_plane) {
    const double c = std::pow(std::max(cosine, 1e-6), n - 1);
    if (!in_plane) return 0.5 * (n + 1) * c;
    const double all = std::sqrt(pi) * std::tgamma(0.5 * (n + 1)) / std::tgamma(0.5 * n + 1);
    return 2 * c / all;
}

FirstFlight::FirstFlight(const geometry::Domain& domain, const geometry::Surface& surface,
                         const geometry::RayCaster& caster, double cosine_power,
                         const Options& options) {
    RILLE_CHECK(options.rays_per_element > 0 && options.rays_per_element % batches == 0,
                "rays per element must be a multiple of the number of batches");
    per_batch_ = options.rays_per_element / batches;
    const std::size_t n = surface.size();
    rays_.assign(n * options.rays_per_element, {-1, 0});
    tbb::parallel_for(tbb::blocked_range<std::size_t>(0, n, 8), [&](const auto& range) {
        for (std::size_t e = range.begin(); e != range.end(); ++e)
            for (int b = 0; b < batches; ++b) {
                const ScrambledPoints stream(
                    stream_key(options.seed, stream_name, options.refresh, e, b));
                Ray* ray = &rays_[(e * batches + b) * per_batch_];
                for (int r = 0; r < per_batch_; ++r) {
                    const Departure d = depart(domain, surface, int(e), stream, r);
                    const Hit hit = caster.trace(d.from, d.towards, int(e));
                    if (hit.kind != Hit::Kind::surface) continue;
                    const double cosine = -surface.normal[hit.element].dot(hit.direction);
                    ray[r] = {hit.element,
                              float(emission_weight(cosine_power, cosine, domain.extruded()))};
                }
            }
    });
}

void FirstFlight::apply(int batch, const double* emitted, double* arrival) const {
    const std::size_t all = std::size_t(per_batch_) * batches, n = rays_.size() / all;
    const std::size_t count = batch < 0 ? all : per_batch_;
    tbb::parallel_for(tbb::blocked_range<std::size_t>(0, n, 64), [&](const auto& range) {
        for (std::size_t e = range.begin(); e != range.end(); ++e) {
            const Ray* ray = &rays_[e * all + (batch < 0 ? 0 : batch * per_batch_)];
            double sum = 0;
            for (std::size_t r = 0; r < count; ++r)
                if (ray[r].from >= 0) sum += ray[r].weight * emitted[ray[r].from];
            arrival[e] = sum / double(count);
        }
    });
}

} // namespace rille::fluxes
