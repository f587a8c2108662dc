// SPDX-License-Identifier: Apache-2.0
// Plain forward tracing of reflecting ions: launched evenly through the source plane with
// pseudo-random numbers, kept or reflected by chance. Nothing in common with the production way but
// the ray caster and the laws of a single reflection.
#pragma once

#include "fluxes/arc_average.hpp"
#include "fluxes/ion_reflection.hpp"
#include "fluxes/ions.hpp"
#include "geometry/facets.hpp"
#include "geometry/ray_caster.hpp"

#include <tbb/parallel_for.h>

#include <algorithm>
#include <cmath>
#include <random>
#include <vector>

namespace rille::tests {

/// Flux of ions after at least one reflection times the root of their energy [eV^1/2], per bin,
/// with standard errors; relative to the ion flux through the source plane.
struct IonWalkResult {
    std::vector<double> value, error;
};

/// Of each ion one reflected arrival, chosen at random, is tallied with the weight of all of them:
/// unbiased, and bins are almost independent of each other.
inline IonWalkResult forward_ions(const geometry::Domain& domain, const geometry::Surface& surface,
                                  const geometry::RayCaster& caster,
                                  const fluxes::IonSource& source,
                                  const std::vector<fluxes::IonReflection>& laws,
                                  const std::vector<int>& material, const std::vector<int>& bin,
                                  int bins, int ions, std::uint64_t seed) {
    using geometry::Hit;
    using geometry::Vec3;
    constexpr int chunks = 64;
    const auto mean = fluxes::averaged_normals(surface, fluxes::arc_average(domain, surface));
    std::vector<std::vector<double>> sum(chunks, std::vector<double>(bins, 0)), squares = sum;
    const int per_chunk = ions / chunks;
    tbb::parallel_for(0, chunks, [&](int k) {
        std::mt19937_64 random(seed * 1000003 + k);
        std::uniform_real_distribution<double> u(0, 1);
        for (int i = 0; i < per_chunk; ++i) {
            Vec3 start(domain.x_min() + u(random) * domain.width_x(),
                       domain.planar_contour() ? 0 : domain.y_min() + u(random) * domain.width_y(),
                       caster.z_open() - 1e-9);
            if (domain.revolved()) start.x = std::sqrt(start.x * domain.width_x());
            const auto ion =
                source.distribution.sample({u(random), u(random), u(random), u(random)});
            double energy = ion.energy_ev, kept = 0;
            Hit hit = caster.trace(start, ion.direction, -1);
            int arrivals = 0, chosen = -1;
            while (hit.kind == Hit::Kind::surface) {
                const int e = hit.element;
                const double cosine = std::clamp(-hit.direction.dot(mean[e]), 0.0, 1.0);
                // The first contact is direct; every later one counts.
                if (arrivals > 0 && u(random) * arrivals < 1)
                    chosen = bin[e], kept = std::sqrt(energy);
                ++arrivals;
                if (u(random) >= fluxes::reflection_probability(laws[material[e]], cosine)) break;
                energy *= fluxes::energy_kept(laws[material[e]], source.mass_amu, cosine);
                const Vec3 out = fluxes::reflected_direction(
                    laws[material[e]], hit.direction, mean[e],
                    geometry::normal_at(surface, e, hit.point), {u(random), u(random)}, random());
                hit = caster.trace(hit.point, out, e);
            }
            const double value = kept * (arrivals - 1);
            if (chosen >= 0) sum[k][chosen] += value, squares[k][chosen] += value * value;
        }
    });
    std::vector<double> area(bins, 0);
    for (std::size_t e = 0; e < surface.size(); ++e)
        if (bin[e] >= 0) area[bin[e]] += surface.area[e];
    const double plane = domain.base_area();
    const double count = double(per_chunk) * chunks;
    IonWalkResult result;
    for (int b = 0; b < bins; ++b) {
        double all = 0, square = 0;
        for (int k = 0; k < chunks; ++k)
            all += sum[k][b], square += squares[k][b];
        const double mean_value = all / count;
        result.value.push_back(plane / area[b] * mean_value);
        result.error.push_back(plane / area[b] *
                               std::sqrt((square / count - mean_value * mean_value) / count));
    }
    return result;
}

} // namespace rille::tests
