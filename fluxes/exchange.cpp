// SPDX-License-Identifier: Apache-2.0
#include "fluxes/exchange.hpp"

#include "fluxes/aim.hpp"
#include "fluxes/krylov.hpp"
#include "fluxes/launch.hpp"
#include "fluxes/sampling.hpp"
#include "fluxes/spatial_order.hpp"
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
constexpr std::uint32_t block = 256; // elements that share a sequence
constexpr double largest_share = 2;  // of a ray in its batch, times the number of rays
constexpr int whole = 65535;         // stands for it

} // namespace

/// Traces the rays of one element after another into its slots of the exchange.
struct Exchange::Tracing {
    Exchange& exchange;
    const geometry::Domain& domain;
    const geometry::Surface& surface;
    const geometry::RayCaster& caster;
    const Options& options;
    std::optional<OpeningAims> aims;

    /// The sequence of a batch for one kind of ray in the block of elements about `place`.
    ScrambledPoints points(int batch, int kind, std::uint32_t place) const {
        return ScrambledPoints(
            stream_key(options.seed, stream_name, options.refresh, batch, kind, place / block));
    }
    /// Files a ray of weight `share` / (rays of the batch); returns what it adds to d.
    double keep(const Hit& hit, int element, int batch, double share) {
        if (hit.kind == Hit::Kind::open) return share / exchange.per_batch_;
        if (hit.kind != Hit::Kind::surface) return 0;
        auto& count = exchange.hits_[std::size_t(element) * batches + batch];
        const std::size_t slot = (std::size_t(element) * batches + batch) * exchange.per_batch_;
        exchange.target_[slot + count] = hit.element;
        exchange.weight_[slot + count++] =
            static_cast<std::uint16_t>(std::lround(whole * std::sqrt(share / largest_share)));
        return 0;
    }
    double extruded(int element, int batch, std::uint32_t place);
    double by_cosine(int element, int batch, std::uint32_t place);
    double aimed(int element, int batch, std::uint32_t place, const std::vector<Aim>& to);
    void trace(int element, std::uint32_t place);
};

/// In-plane directions suffice: diffuse emission has the in-plane density cos(alpha) / 2, so
/// sin(alpha) is uniform. What is not hit is open.
double Exchange::Tracing::extruded(int element, int batch, std::uint32_t place) {
    const Vec3 a = surface.vertices[surface.corners[element][0]];
    const Vec3 b = surface.vertices[surface.corners[element][1]];
    const double psi = std::atan2(surface.normal[element].x, surface.normal[element].z);
    const ScrambledPoints stream = points(batch, 0, place);
    double flux = 0;
    for (int r = 0; r < exchange.per_batch_; ++r) {
        const auto u = stream.pair(place % block * exchange.per_batch_ + r, 0);
        const double sine = 2 * (u[1] + 1e-12) - 1;
        const double phi = psi + std::asin(std::clamp(sine, -1.0, 1.0));
        flux += keep(caster.trace(a + (b - a) * u[0], {std::sin(phi), 0, std::cos(phi)}, element),
                     element, batch, 1);
    }
    return flux;
}

double Exchange::Tracing::by_cosine(int element, int batch, std::uint32_t place) {
    const ScrambledPoints stream = points(batch, 1, place);
    double flux = 0;
    for (int r = 0; r < exchange.per_batch_; ++r) {
        const std::uint32_t index = place % block * exchange.per_batch_ + r;
        const auto u = stream.pair(index, 0), v = stream.pair(index, 1);
        const Launch from = launch_from(surface, element, v[0], v[1]);
        const Vec3 d = cosine_direction(from.normal, u[0], u[1]);
        flux += keep(caster.trace(from.point, d, element), element, batch, 1);
    }
    return flux;
}

namespace {

/// Density per solid angle of directions through even places on a rectangle.
double density(const Aim& aim, const Vec3& from, const Vec3& d) {
    const double up = (aim.z - from.z) / d.z; // path length to the rectangle
    const double x = from.x + up * d.x, y = from.y + up * d.y;
    const bool inside = up > 0 && x > aim.x0 && x < aim.x1 && y > aim.y0 && y < aim.y1;
    return inside ? up * up / (aim.area() * d.z) : 0;
}

} // namespace

/// Half of the rays by the cosine law; a quarter through the first rectangle, which d rests on, and
/// a quarter through the others, each as often as the next.
double Exchange::Tracing::aimed(int element, int batch, std::uint32_t place,
                                const std::vector<Aim>& to) {
    const int n = exchange.per_batch_, half = n / 2;
    const double others = double(to.size()) - 1, first = others > 0 ? 0.5 : 1.0;
    const auto share = [&](const Launch& start, const Vec3& d) {
        const double by_cosine = std::max(0.0, start.normal.dot(d)) / pi;
        double by_aim = 0;
        for (std::size_t i = 0; i < to.size() && d.z > 0; ++i)
            by_aim += density(to[i], start.point, d) * (i == 0 ? first : (1 - first) / others);
        return n * by_cosine / ((n - half) * by_cosine + half * by_aim);
    };
    double flux = 0;
    const auto send = [&](const Launch& from, const Vec3& d) {
        flux += keep(caster.trace(from.point, d, element), element, batch, share(from, d));
    };
    const ScrambledPoints cosine = points(batch, 2, place), through = points(batch, 3, place);
    for (int r = 0; r < n - half; ++r) {
        const std::uint32_t index = place % block * (n - half) + r;
        const auto u = cosine.pair(index, 0), v = cosine.pair(index, 1);
        const Launch from = launch_from(surface, element, v[0], v[1]);
        send(from, cosine_direction(from.normal, u[0], u[1]));
    }
    for (int r = 0; r < half; ++r) {
        const std::uint32_t index = place % block * half + r;
        const auto u = through.pair(index, 0), v = through.pair(index, 1);
        const double which = through.pair(index, 2)[0];
        const Launch from = launch_from(surface, element, v[0], v[1]);
        const Aim& aim = to[which < first ? 0 : 1 + int((which - first) / (1 - first) * others)];
        const Vec3 at(aim.x0 + u[0] * (aim.x1 - aim.x0), aim.y0 + u[1] * (aim.y1 - aim.y0), aim.z);
        const Vec3 d = (at - from.point).normalized();
        if (d.z > 0 && from.normal.dot(d) > 0) send(from, d);
    }
    return flux;
}

void Exchange::Tracing::trace(int element, std::uint32_t place) {
    const std::vector<Aim> to =
        aims && exchange.per_batch_ > 1 ? aims->from(surface.centre[element]) : std::vector<Aim>{};
    double sum = 0;
    for (int batch = 0; batch < batches; ++batch) {
        const double flux = domain.extruded() ? extruded(element, batch, place)
                            : to.empty()      ? by_cosine(element, batch, place)
                                              : aimed(element, batch, place, to);
        sum += exchange.batch_direct_[batch][element] = std::min(flux, 1.0);
    }
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
    weight_.assign(target_.size(), 0);
    hits_.assign(n * batches, 0);
    const std::vector<int> order = spatial_order(surface);
    Tracing tracing{*this, domain, surface, caster, options, std::nullopt};
    if (!domain.extruded()) tracing.aims.emplace(domain, caster);
    tbb::parallel_for(tbb::blocked_range<std::size_t>(0, n, 8), [&](const auto& range) {
        for (std::size_t place = range.begin(); place != range.end(); ++place)
            tracing.trace(order[place], static_cast<std::uint32_t>(place));
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
    double sum = 0, weight = 0;
    const int from = std::max(batch, 0), to = batch < 0 ? batches : batch + 1;
    for (int b = from; b < to; ++b) {
        const std::int32_t* t = target_.data() + (first + b) * per_batch_;
        const std::uint16_t* root = weight_.data() + (first + b) * per_batch_;
        for (int r = 0; r < hits_[first + b]; ++r) {
            const double w = double(root[r]) * root[r];
            weight += w;
            sum += w * emitted[t[r]];
        }
    }
    const double unit = largest_share / (double(whole) * whole * per_batch_ * (to - from));
    const double rest = 1 - direct(batch)[element];
    return unit * sum + (rest - unit * weight) * emitted[element];
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
