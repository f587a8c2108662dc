// SPDX-License-Identifier: Apache-2.0
#include "fluxes/exchange.hpp"

#include "fluxes/aim.hpp"
#include "fluxes/krylov.hpp"
#include "fluxes/launch.hpp"
#include "fluxes/sampling.hpp"
#include "geometry/check.hpp"

#include <tbb/blocked_range.h>
#include <tbb/parallel_for.h>

#include <algorithm>
#include <cmath>
#include <optional>

namespace rille::fluxes {
namespace {

using geometry::Hit;
using geometry::Vec3;

constexpr double pi = 3.14159265358979323846;
constexpr std::uint64_t stream_name = 0x6e65757472616cULL; // keeps these streams apart from others
constexpr std::size_t grain = 64;

} // namespace

/// Traces the rays of one element after another into its slots of the exchange.
struct Exchange::Tracing {
    Exchange& exchange;
    const geometry::Domain& domain;
    const geometry::Surface& surface;
    const geometry::RayCaster& caster;
    const Options& options;
    std::optional<OpeningAims> aims;

    ScrambledPoints points(int element, int batch) const {
        return ScrambledPoints(
            stream_key(options.seed, stream_name, options.refresh, element, batch));
    }
    void keep(const Hit& hit, int element, int batch) {
        if (hit.kind != Hit::Kind::surface) return;
        auto& count = exchange.hits_[std::size_t(element) * batches + batch];
        const std::size_t slot = (std::size_t(element) * batches + batch) * exchange.per_batch_;
        exchange.target_[slot + count++] = hit.element;
    }
    void sort(int element, int batch) {
        const std::size_t i = std::size_t(element) * batches + batch;
        const auto first = exchange.target_.begin() + i * exchange.per_batch_;
        std::sort(first, first + exchange.hits_[i]);
    }
    void extruded(int element);
    void full(int element);
    double sky_flux(int element, int batch, const std::optional<Aim>& aim);
};

/// In-plane directions suffice: diffuse emission has the in-plane density cos(alpha) / 2, so
/// sin(alpha) is uniform. What is not hit is open.
void Exchange::Tracing::extruded(int element) {
    const Vec3 a = surface.vertices[surface.corners[element][0]];
    const Vec3 b = surface.vertices[surface.corners[element][1]];
    const double psi = std::atan2(surface.normal[element].x, surface.normal[element].z);
    double sum = 0;
    for (int batch = 0; batch < batches; ++batch) {
        const ScrambledPoints stream = points(element, batch);
        for (int r = 0; r < exchange.per_batch_; ++r) {
            const auto u = stream.pair(r, 0);
            const double sine = 2 * (u[1] + 1e-12) - 1;
            const double phi = psi + std::asin(std::clamp(sine, -1.0, 1.0));
            keep(caster.trace(a + (b - a) * u[0], {std::sin(phi), 0, std::cos(phi)}, element),
                 element, batch);
        }
        sort(element, batch);
        const double hits = exchange.hits_[std::size_t(element) * batches + batch];
        sum += exchange.batch_direct_[batch][element] = 1 - hits / exchange.per_batch_;
    }
    exchange.direct_[element] = sum / batches;
}

/// Sends the rays of one batch and returns its direct flux by the balance heuristic: every ray that
/// escapes adds (cosine density) / (density of both kinds of ray together).
/// Source: Veach & Guibas, Optimally combining sampling techniques (1995) [from memory].
double Exchange::Tracing::sky_flux(int element, int batch, const std::optional<Aim>& aim) {
    const ScrambledPoints stream = points(element, batch);
    const int n = exchange.per_batch_;
    const auto weight = [&](const Launch& start, const Vec3& d) {
        const Vec3& from = start.point;
        const double by_cosine = std::max(0.0, start.normal.dot(d)) / pi;
        double by_aim = 0;
        if (aim && d.z > 0) {
            const double up = (aim->z - from.z) / d.z; // path length to the rectangle
            const double x = from.x + up * d.x, y = from.y + up * d.y;
            if (up > 0 && x > aim->x0 && x < aim->x1 && y > aim->y0 && y < aim->y1)
                by_aim = up * up / (aim->area() * d.z);
        }
        return by_cosine > 0 ? by_cosine / (n * (by_cosine + by_aim)) : 0;
    };
    double flux = 0;
    for (int r = 0; r < n; ++r) {
        const auto u = stream.pair(r, 0), v = stream.pair(r, 1);
        const Launch from = launch_from(surface, element, v[0], v[1]);
        const Vec3 d = cosine_direction(from.normal, u[0], u[1]);
        const Hit hit = caster.trace(from.point, d, element);
        keep(hit, element, batch);
        if (hit.kind == Hit::Kind::open) flux += weight(from, d);
    }
    for (int r = 0; aim && r < n; ++r) {
        const auto u = stream.pair(r, 2), v = stream.pair(r, 3);
        const Launch from = launch_from(surface, element, v[0], v[1]);
        const Vec3 to(aim->x0 + u[0] * (aim->x1 - aim->x0), aim->y0 + u[1] * (aim->y1 - aim->y0),
                      aim->z);
        const Vec3 d = (to - from.point).normalized();
        if (d.z <= 0 || from.normal.dot(d) <= 0) continue;
        if (caster.trace(from.point, d, element).kind == Hit::Kind::open) flux += weight(from, d);
    }
    sort(element, batch);
    return std::min(flux, 1.0);
}

void Exchange::Tracing::full(int element) {
    const std::optional<Aim> aim = aims->from(surface.centre[element]);
    double sum = 0;
    for (int batch = 0; batch < batches; ++batch)
        sum += exchange.batch_direct_[batch][element] = sky_flux(element, batch, aim);
    exchange.direct_[element] = sum / batches;
}

Exchange::Exchange(const geometry::Domain& domain, const geometry::Surface& surface,
                   const geometry::RayCaster& caster, const Options& options) {
    RILLE_CHECK(options.rays_per_element > 0 && options.rays_per_element % batches == 0,
                "rays per element must be a multiple of the number of batches");
    per_batch_ = options.rays_per_element / batches;
    const std::size_t n = surface.size();
    direct_.assign(n, 0);
    batch_direct_.assign(batches, std::vector<double>(n, 0));
    target_.assign(n * options.rays_per_element, -1);
    hits_.assign(n * batches, 0);
    Tracing tracing{*this, domain, surface, caster, options, std::nullopt};
    if (!domain.extruded()) tracing.aims.emplace(domain, caster);
    tbb::parallel_for(tbb::blocked_range<std::size_t>(0, n, 8), [&](const auto& range) {
        for (std::size_t e = range.begin(); e != range.end(); ++e)
            domain.extruded() ? tracing.extruded(int(e)) : tracing.full(int(e));
    });
    find_open();
}

void Exchange::find_open() {
    const int n = static_cast<int>(size()), rays = per_batch_ * batches;
    open_.assign(n, 0);
    for (int e = 0; e < n; ++e)
        open_[e] = direct_[e] > 0;
    // Sweeps in alternating order: paths to the open are short, so a few suffice.
    for (bool changed = true, upwards = true; changed; upwards = !upwards) {
        changed = false;
        for (int k = 0; k < n; ++k) {
            const int e = upwards ? k : n - 1 - k;
            for (int r = 0; r < rays && !open_[e]; ++r) {
                const std::int32_t t = target_[std::size_t(e) * rays + r];
                if (t >= 0 && open_[t]) open_[e] = 1, changed = true;
            }
        }
    }
}

double Exchange::row(int element, int batch, const double* emitted) const {
    const std::size_t first = std::size_t(element) * batches;
    const auto gather = [&](int b, double& sum) {
        const std::int32_t* t = target_.data() + (first + b) * per_batch_;
        const int count = hits_[first + b];
        for (int r = 0; r < count; ++r)
            sum += emitted[t[r]];
        return count;
    };
    const double rest = 1 - direct(batch)[element];
    double sum = 0;
    if (batch >= 0) {
        const int count = gather(batch, sum);
        if (count > 0) return rest * sum / count;
    }
    int count = 0;
    for (int b = 0; b < batches; ++b)
        count += gather(b, sum);
    // What no ray has found lies close by: the element's own surroundings.
    return rest * (count > 0 ? sum / count : emitted[element]);
}

void Exchange::apply(int batch, const double* emitted, double* arrival) const {
    tbb::parallel_for(tbb::blocked_range<std::size_t>(0, size(), grain), [&](const auto& range) {
        for (std::size_t e = range.begin(); e != range.end(); ++e)
            arrival[e] = open_[e] ? row(int(e), batch, emitted) : 0.0;
    });
}

std::vector<double> Exchange::solve(const std::vector<double>& sticking, int batch,
                                    const std::vector<double>& guess, int* iterations) const {
    RILLE_CHECK(sticking.size() == size() && batch < batches, "one sticking per element");
    const std::size_t n = size();
    std::vector<double> x = guess.size() == n ? guess : std::vector<double>(n, 1.0);
    std::vector<double> emitted(n);
    std::vector<double> rhs = direct(batch);
    for (std::size_t e = 0; e < n; ++e)
        if (!open_[e]) x[e] = rhs[e] = 0;
    const LinearSolution solved = solve_linear(
        [&](const double* in, double* out) {
            for (std::size_t e = 0; e < n; ++e)
                emitted[e] = (1 - sticking[e]) * in[e];
            apply(batch, emitted.data(), out);
            for (std::size_t e = 0; e < n; ++e)
                out[e] = in[e] - out[e];
        },
        rhs, x, 1e-10);
    if (!solved.converged) throw NumericsError("the neutral transport equations did not converge");
    if (iterations) *iterations += solved.iterations;
    for (double& value : x)
        value = std::max(value, 0.0);
    return x;
}

} // namespace rille::fluxes
