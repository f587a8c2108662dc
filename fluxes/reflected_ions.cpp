// SPDX-License-Identifier: Apache-2.0
#include "fluxes/reflected_ions.hpp"

#include "fluxes/first_strikes.hpp"
#include "fluxes/ion_reflection.hpp"
#include "fluxes/sampling.hpp"
#include "geometry/facets.hpp"

#include <tbb/parallel_for.h>

#include <algorithm>
#include <cmath>
#include <numeric>

namespace rille::fluxes {
namespace {

using geometry::Hit;

constexpr std::uint64_t stream = 0x7265666c656374ULL; ///< keeps keys apart from other samplings
constexpr double degree = 3.14159265358979323846 / 180;
constexpr int chunk_ions = 512;
constexpr double roulette_below = 0.05;
constexpr int longest_path = 100000; ///< hits; counted as lost, not cut silently

using Deposit = ReflectedIons::Deposit;

/// Towards where an arrival comes from, times its flux.
struct Origin {
    int element;
    double up, along;
};
struct Chunk {
    int ion = 0, batch = 0, first = 0, count = 0;
    int of = 0;                    ///< ions of this species in the batch
    std::vector<Deposit> deposits; ///< in the order in which the ions made them
    std::vector<Origin> origins;
    double lost = 0; ///< flux times area
};

class Tracer {
public:
    Tracer(const geometry::Domain& domain, const geometry::Surface& surface,
           const geometry::RayCaster& caster, const std::vector<int>& material,
           const DirectIons& direct, const std::vector<IonReflection>& reflection,
           const ReflectionOptions& options)
        : domain_(domain), surface_(surface), caster_(caster), material_(material),
          ions_(direct.tables().ions()), tallies_(direct.tables().tallies()),
          reflection_(reflection), options_(options), wanted_(direct.wanted()),
          average_(direct.average()), normal_(direct.normal()),
          bound_(reflection), scene_{domain, surface, material, normal_, bound_, direct},
          strikes_(make_strikes()) {
        for (const IonReflection& law : reflection)
            critical_.push_back(law.probability > 0 && law.critical_deg < 90
                                    ? std::cos(law.critical_deg * degree) + 1e-12
                                    : -1);
        for (std::size_t s = 0; s < ions_.size(); ++s) {
            least_energy_.push_back(least_energy(static_cast<int>(s)));
            own_sums_.push_back(sums_of(static_cast<int>(s)));
        }
    }

    ReflectedIons run() {
        std::vector<Chunk> chunks = plan();
        tbb::parallel_for(std::size_t(0), chunks.size(), [&](std::size_t c) {
            const std::uint64_t key =
                stream_key(options_.seed, stream, options_.refresh, chunks[c].ion, chunks[c].batch);
            const ScrambledPoints points(key);
            for (int i = 0; i < chunks[c].count; ++i)
                follow(chunks[c], chunks[c].first + i, key, points);
        });
        ReflectedIons result;
        result.sums = static_cast<int>(wanted_.members.size());
        if (options_.averaged) result.average = average_;
        std::vector<double> up(surface_.size(), 0.0), along(surface_.size(), 0.0);
        double lost = 0, incident = 0;
        for (const IonSource& ion : ions_)
            incident += ion.flux * domain_.base_area();
        for (const Chunk& chunk : chunks) {
            for (const Origin& o : chunk.origins) {
                up[o.element] += o.up;
                along[o.element] += o.along;
            }
            lost += chunk.lost / batches;
        }
        sort_deposits(chunks, result);
        result.from_angle = angles_of(up, along);
        result.lost_share = incident > 0 ? lost / incident : 0.0;
        return result;
    }

private:
    double own_angle(std::size_t e) const {
        const Vec3& n = normal_[e];
        return domain_.planar_contour() ? std::atan2(n.x, n.z)
                                        : std::acos(std::clamp(n.z, -1.0, 1.0));
    }
    /// Part of a direction along the horizontal part of an element's normal.
    double along_normal(const Vec3& direction, int e) const {
        if (domain_.planar_contour()) return direction.x;
        const Vec3& n = normal_[e];
        const double flat = std::hypot(n.x, n.y);
        return flat > 1e-9 ? (direction.x * n.x + direction.y * n.y) / flat : 0.0;
    }
    std::vector<double> angles_of(const std::vector<double>& up,
                                  const std::vector<double>& along) const {
        std::vector<double> angle(surface_.size());
        for (std::size_t e = 0; e < angle.size(); ++e) {
            const double z = average_->of(up, int(e));
            const double h = domain_.planar_contour() ? average_->of_sideways(along, int(e))
                                                      : average_->of(along, int(e));
            angle[e] = z != 0 || h != 0 ? std::atan2(h, z) : own_angle(e);
        }
        return angle;
    }

    /// By elements, and in the order of the chunks on each.
    void sort_deposits(std::vector<Chunk>& chunks, ReflectedIons& result) const {
        result.first.assign(surface_.size() + 1, 0);
        for (const Chunk& chunk : chunks)
            for (const Deposit& d : chunk.deposits)
                ++result.first[d.element + 1];
        std::partial_sum(result.first.begin(), result.first.end(), result.first.begin());
        result.deposits.resize(result.first.back());
        std::vector<int> next = result.first;
        for (Chunk& chunk : chunks) {
            for (const Deposit& d : chunk.deposits)
                result.deposits[next[d.element]++] = d;
            std::vector<Deposit>().swap(chunk.deposits);
        }
    }

    /// Tallies of one ion species by the sum that they count for.
    struct OwnSum {
        int sum;
        std::vector<int> tallies;
    };
    std::vector<OwnSum> sums_of(int ion) const {
        std::vector<OwnSum> sums;
        for (std::size_t s = 0; s < wanted_.members.size(); ++s) {
            OwnSum own{static_cast<int>(s), {}};
            for (const int m : wanted_.members[s])
                if (tallies_[m].ion == ion) own.tallies.push_back(m);
            if (!own.tallies.empty()) sums.push_back(std::move(own));
        }
        return sums;
    }

    FirstStrikes make_strikes() const {
        if (domain_.extruded()) return FirstStrikes(std::in_place_type<ExtrudedStrikes>, scene_);
        return FirstStrikes(std::in_place_type<FullStrikes>, scene_);
    }
    double total(int ion, int batch) const {
        return std::visit([&](const auto& s) { return s.total(ion, batch); }, strikes_);
    }

    /// Half of the ions are shared out by the flux that each species reflects, half evenly: the
    /// yields of a rare species can be large.
    std::vector<Chunk> plan() const {
        std::vector<Chunk> chunks;
        const int species = static_cast<int>(ions_.size());
        const double all = double(std::max(0, options_.ions_per_species)) / batches * species;
        for (int b = 0; b < batches; ++b) {
            double sum = 0;
            int active = 0;
            for (int s = 0; s < species; ++s) {
                sum += acts(s) ? total(s, b) : 0;
                active += acts(s) && total(s, b) > 0;
            }
            for (int s = 0; s < species; ++s) {
                const double own = acts(s) ? total(s, b) : 0;
                if (!(own > 0) || !(all > 0)) continue;
                const double share = 0.5 * own / sum + 0.5 / active;
                const int count = static_cast<int>(std::ceil(all * share));
                for (int first = 0; first < count; first += chunk_ions) {
                    chunks.emplace_back();
                    Chunk& chunk = chunks.back();
                    chunk.ion = s;
                    chunk.batch = b;
                    chunk.of = count;
                    chunk.first = first;
                    chunk.count = std::min(chunk_ions, count - first);
                }
            }
        }
        return chunks;
    }
    bool acts(int ion) const { return !own_sums_[ion].empty(); }

    /// One ion from its first contact until it stays, leaves, or cannot do anything any more.
    void follow(Chunk& chunk, int index, std::uint64_t batch_key,
                const ScrambledPoints& points) const {
        const auto i = static_cast<std::uint32_t>(index);
        const Strike strike = std::visit(
            [&](const auto& s) { return s.draw(chunk.ion, chunk.batch, points, i, chunk.of); },
            strikes_);
        if (strike.element < 0) return;
        const std::uint64_t key = stream_key(batch_key, index, 1);
        double weight = 1, energy = strike.ion.energy_ev;
        Hit hit{Hit::Kind::surface, strike.element, 0, strike.point, strike.ion.direction};
        Vec3 own = strike.normal;
        for (int hits = 0;; ++hits) {
            if (hit.kind == Hit::Kind::lost || hits == longest_path)
                chunk.lost += weight * strike.carried;
            if (hit.kind != Hit::Kind::surface || hits == longest_path) return;
            const Vec3 mean = normal_[hit.element];
            const double cosine = std::clamp(-hit.direction.dot(mean), 0.0, 1.0);
            if (hits > 0) {
                deposit(chunk, hit, weight * strike.carried, energy, cosine,
                        std::min(hits, bounce_classes) - 1);
                own = geometry::normal_at(surface_, hit.element, hit.point);
            }
            if (!(cosine < critical_[material_[hit.element]])) return; // stays
            const IonReflection& law = reflection_[material_[hit.element]];
            weight *= reflection_probability(law, cosine);
            energy *= energy_kept(law, ions_[chunk.ion].mass_amu, cosine);
            if (!(weight > 0) || energy <= least_energy_[chunk.ion]) return;
            if (weight * strike.carried < roulette_below * equal_share(chunk)) {
                const double kept = roulette_below * equal_share(chunk) / strike.carried;
                if (unit_interval(stream_key(key, hits, 7)) * kept >= weight) return;
                weight = kept;
            }
            const std::uint64_t scatter = stream_key(key, hits, 11);
            const std::array<double, 2> first =
                hits == 0 ? strike.scatter
                          : std::array<double, 2>{unit_interval(stream_key(scatter, 0)),
                                                  unit_interval(stream_key(scatter, 1))};
            const Vec3 out = reflected_direction(law, hit.direction, mean, own, first, scatter);
            hit = caster_.trace(hit.point, out, hit.element);
        }
    }
    /// Reflected flux times area that an ion stands for at most, if the guide is right.
    double equal_share(const Chunk& chunk) const {
        return total(chunk.ion, chunk.batch) / chunk.of;
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

    void deposit(Chunk& chunk, const Hit& hit, double carried, double energy, double cosine,
                 std::size_t bounces) const {
        const double flux = carried / surface_.area[hit.element];
        chunk.origins.push_back({hit.element, -flux * hit.direction.z,
                                 -flux * along_normal(hit.direction, hit.element)});
        const std::size_t row = chunk.batch * bounce_classes + bounces;
        for (const OwnSum& own : own_sums_[chunk.ion]) {
            double value = 0;
            for (const int m : own.tallies)
                value += flux * tallies_[m].yield(energy, cosine);
            const std::size_t slot = row * wanted_.members.size() + own.sum;
            if (value != 0) chunk.deposits.push_back({hit.element, static_cast<int>(slot), value});
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
    const WantedSums& wanted_;
    std::shared_ptr<const ArcAverage> average_;
    const std::vector<Vec3>& normal_;
    ReflectionBound bound_;
    StrikeScene scene_;
    FirstStrikes strikes_;
    std::vector<double> critical_;     ///< per material: no reflection at cosines from here on
    std::vector<double> least_energy_; ///< per ion species [eV]
    std::vector<std::vector<OwnSum>> own_sums_; ///< per ion species
};

} // namespace

void ReflectedIons::at(int element, std::vector<double>& value) const {
    value.assign(slots(), 0.0);
    if (first.empty()) return;
    const auto add = [&](int from, double weight) {
        for (int i = first[from]; i < first[from + 1]; ++i)
            value[deposits[i].slot] += weight * deposits[i].value;
    };
    if (!average) return add(element, 1);
    for (int i = average->first[element]; i < average->first[element + 1]; ++i)
        add(average->parts[i].element, average->parts[i].weight);
}

double share_after_turn(double own, double from, double angle) {
    constexpr double idle = 10 * degree, right = 90 * degree;
    const double turn = std::fabs(angle - own);
    if (turn <= idle) return 1;
    const double counted = std::copysign(right * (turn - idle) / (right - idle), angle - own);
    const double facing = std::cos(own - from);
    if (!(facing > 0)) return 1;
    return std::clamp(std::cos(std::clamp(own + counted - from, -2 * right, 2 * right)) / facing,
                      0.0, 1.0);
}

ReflectedIons trace_reflected(const geometry::Domain& domain, const geometry::Surface& surface,
                              const geometry::RayCaster& caster, const std::vector<int>& material,
                              const DirectIons& direct,
                              const std::vector<IonReflection>& reflection,
                              const ReflectionOptions& options) {
    return Tracer(domain, surface, caster, material, direct, reflection, options).run();
}

} // namespace rille::fluxes
