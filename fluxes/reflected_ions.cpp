// SPDX-License-Identifier: Apache-2.0
#include "fluxes/reflected_ions.hpp"

#include "fluxes/arc_average.hpp"
#include "fluxes/ion_reflection.hpp"
#include "fluxes/sampling.hpp"
#include "geometry/facets.hpp"

#include <tbb/parallel_for.h>

#include <algorithm>
#include <cmath>

namespace rille::fluxes {
namespace {

using geometry::Hit;

constexpr std::uint64_t stream = 0x7265666c656374ULL; ///< keeps keys apart from other samplings
constexpr double degree = 3.14159265358979323846 / 180;
constexpr int chunk_ions = 1024;
constexpr double roulette_below = 0.05;
constexpr int longest_path = 100000; ///< hits; counted as lost, not cut silently

/// One contribution, in the order in which a chunk's ions made it.
struct Deposit {
    std::size_t slot; ///< m * elements + e
    double value;
};
struct Chunk {
    int ion = 0, batch = 0, first = 0, count = 0;
    std::vector<Deposit> deposits;
    double lost = 0;
};

class Tracer {
public:
    Tracer(const geometry::Domain& domain, const geometry::Surface& surface,
           const geometry::RayCaster& caster, const std::vector<int>& material,
           const std::vector<IonSource>& ions, const std::vector<Tally>& tallies,
           const std::vector<IonReflection>& reflection, const ReflectionOptions& options)
        : domain_(domain), surface_(surface), caster_(caster), material_(material), ions_(ions),
          tallies_(tallies), reflection_(reflection), options_(options),
          normal_(averaged_normals(surface, arc_average(domain, surface))),
          per_batch_(std::max(1, options.ions_per_species / batches)) {
        for (const IonReflection& law : reflection)
            critical_.push_back(law.probability > 0 && law.critical_deg < 90
                                    ? std::cos(law.critical_deg * degree) + 1e-12
                                    : -1);
        for (std::size_t s = 0; s < ions.size(); ++s) {
            least_energy_.push_back(least_energy(static_cast<int>(s)));
            own_tallies_.emplace_back();
            for (std::size_t m = 0; m < tallies.size(); ++m)
                if (tallies[m].ion == static_cast<int>(s))
                    own_tallies_.back().push_back(static_cast<int>(m));
        }
    }

    ReflectedIons run() {
        std::vector<Chunk> chunks = plan();
        tbb::parallel_for(std::size_t(0), chunks.size(), [&](std::size_t c) {
            for (int i = 0; i < chunks[c].count; ++i)
                follow(chunks[c], chunks[c].first + i);
        });
        ReflectedIons result;
        result.value.assign(batches, std::vector<double>(tallies_.size() * surface_.size(), 0.0));
        double lost = 0, incident = 0;
        for (const IonSource& ion : ions_)
            incident += ion.flux;
        for (const Chunk& chunk : chunks) {
            for (const Deposit& d : chunk.deposits)
                result.value[chunk.batch][d.slot] += d.value;
            lost += chunk.lost * ions_[chunk.ion].flux / (double(per_batch_) * batches);
        }
        result.lost_share = incident > 0 ? lost / incident : 0.0;
        return result;
    }

private:
    std::vector<Chunk> plan() const {
        std::vector<Chunk> chunks;
        for (int s = 0; s < static_cast<int>(ions_.size()); ++s) {
            if (!(ions_[s].flux > 0) || options_.ions_per_species <= 0) continue;
            for (int b = 0; b < batches; ++b)
                for (int first = 0; first < per_batch_; first += chunk_ions) {
                    chunks.emplace_back();
                    Chunk& chunk = chunks.back();
                    chunk.ion = s;
                    chunk.batch = b;
                    chunk.first = first;
                    chunk.count = std::min(chunk_ions, per_batch_ - first);
                }
        }
        return chunks;
    }

    /// One ion from the source plane until it stays, leaves, or cannot do anything any more.
    void follow(Chunk& chunk, int index) const {
        const std::uint64_t batch_key =
            stream_key(options_.seed, stream, options_.refresh, chunk.ion, chunk.batch);
        const ScrambledPoints points(batch_key);
        const auto i = static_cast<std::uint32_t>(index);
        // In extruded the place of launch and the polar angle, in full the place, is the first
        // pair.
        const bool flat = domain_.extruded();
        const auto p0 = points.pair(i, 0), p1 = points.pair(i, 1);
        const auto p2 = points.pair(i, 2);
        const Vec3 start(domain_.x_min() + domain_.width_x() * p0[0],
                         flat ? 0.0 : domain_.y_min() + domain_.width_y() * p0[1],
                         caster_.z_open());
        const IonSample ion = ions_[chunk.ion].distribution.sample(
            flat ? std::array<double, 4>{p0[1], p1[0], p1[1], p2[0]}
                 : std::array<double, 4>{p1[0], p1[1], p2[0], p2[1]});
        const std::uint64_t key = stream_key(batch_key, index, 1);
        double weight = 1, energy = ion.energy_ev;
        Hit hit = caster_.trace(start, ion.direction, -1);
        for (int hits = 0;; ++hits) {
            if (hit.kind == Hit::Kind::lost || hits == longest_path) chunk.lost += weight;
            if (hit.kind != Hit::Kind::surface || hits == longest_path) return;
            const Vec3 mean = normal_[hit.element];
            const double cosine = std::clamp(-hit.direction.dot(mean), 0.0, 1.0);
            if (hits > 0) deposit(chunk, hit.element, weight, energy, cosine);
            if (!(cosine < critical_[material_[hit.element]])) return; // stays
            const IonReflection& law = reflection_[material_[hit.element]];
            weight *= reflection_probability(law, cosine);
            energy *= energy_kept(law, ions_[chunk.ion].mass_amu, cosine);
            if (!(weight > 0) || energy <= least_energy_[chunk.ion]) return;
            if (weight < roulette_below) {
                if (unit_interval(stream_key(key, hits, 7)) * roulette_below >= weight) return;
                weight = roulette_below;
            }
            const Vec3 out = reflected_direction(
                law, hit.direction, mean, geometry::normal_at(surface_, hit.element, hit.point),
                stream_key(key, hits, 11));
            hit = caster_.trace(hit.point, out, hit.element);
        }
    }

    /// Energy only falls, and no yield grows when it does: an ion at or below the energy returned
    /// (found to 1e-9 of itself from below) does nothing any more.
    double least_energy(int ion) const {
        const auto acts = [&](double energy) {
            return std::any_of(tallies_.begin(), tallies_.end(), [&](const Tally& t) {
                return t.ion == ion && energy_yield(t.yield.energy, energy) > 0;
            });
        };
        double low = 1e-6, high = 1e7;
        if (acts(low)) return 0;
        if (!acts(high)) return high;
        while (high > low * (1 + 1e-9)) {
            const double middle = std::sqrt(low * high);
            (acts(middle) ? high : low) = middle;
        }
        return low;
    }

    void deposit(Chunk& chunk, int element, double weight, double energy, double cosine) const {
        const double base = domain_.width_x() * (domain_.extruded() ? 1.0 : domain_.width_y());
        const double flux =
            weight * ions_[chunk.ion].flux * base / (per_batch_ * surface_.area[element]);
        for (const int m : own_tallies_[chunk.ion]) {
            const double value = flux * tallies_[m].yield(energy, cosine);
            if (value != 0) chunk.deposits.push_back({m * surface_.size() + element, value});
        }
    }

    const geometry::Domain& domain_;
    const geometry::Surface& surface_;
    const geometry::RayCaster& caster_;
    const std::vector<int>& material_;
    const std::vector<IonSource>& ions_;
    const std::vector<Tally>& tallies_;
    const std::vector<IonReflection>& reflection_;
    const ReflectionOptions& options_;
    std::vector<Vec3> normal_;
    std::vector<double> critical_;     ///< per material: no reflection at cosines from here on
    std::vector<double> least_energy_; ///< per ion species [eV]
    std::vector<std::vector<int>> own_tallies_; ///< per ion species
    int per_batch_;
};

} // namespace

ReflectedIons trace_reflected(const geometry::Domain& domain, const geometry::Surface& surface,
                              const geometry::RayCaster& caster, const std::vector<int>& material,
                              const std::vector<IonSource>& ions, const std::vector<Tally>& tallies,
                              const std::vector<IonReflection>& reflection,
                              const ReflectionOptions& options) {
    return Tracer(domain, surface, caster, material, ions, tallies, reflection, options).run();
}

} // namespace rille::fluxes
