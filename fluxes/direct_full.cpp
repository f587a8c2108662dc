// SPDX-License-Identifier: Apache-2.0
#include "fluxes/arc_average.hpp"
#include "fluxes/direct_ions.hpp"
#include "fluxes/exchange.hpp"
#include "fluxes/launch.hpp"
#include "fluxes/sampling.hpp"

#include <tbb/blocked_range.h>
#include <tbb/parallel_for.h>

#include <algorithm>
#include <array>
#include <cmath>

namespace rille::fluxes {
namespace {

using geometry::Hit;

constexpr std::uint64_t stream = 0x64697265637400ULL; ///< keeps keys apart from other samplings

/// An angle law times the received flux is needed at (directions x angles) per element: linear in a
/// table over the cosine, whose error (1e-5) is far below the sampling error.
class AngleTable {
public:
    explicit AngleTable(const AngleLaw& law) {
        for (int i = 0; i <= cells; ++i)
            value_.push_back(angle_factor(law, double(i) / cells));
        value_.push_back(value_.back());
    }
    double operator()(double cosine) const {
        const double x = std::min(cosine, 1.0) * cells;
        const int i = static_cast<int>(x);
        return value_[i] + (x - i) * (value_[i + 1] - value_[i]);
    }

    bool operator==(const AngleTable& other) const { return value_ == other.value_; }

private:
    static constexpr int cells = 2048;
    std::vector<double> value_;
};

/// An energy law over the energies of one distribution: linear in a table where they are spread.
class EnergyTable {
public:
    EnergyTable(const EnergyLaw& law, const IonDistribution& distribution) : law_(law) {
        low_ = high_ = distribution.sample({0.5, 0.5, 0.5, 0.5}).energy_ev;
        const ScrambledPoints points(stream);
        for (std::uint32_t i = 0; i < 256; ++i) {
            const double energy = distribution.sample(points.four(i)).energy_ev;
            low_ = std::min(low_, energy);
            high_ = std::max(high_, energy);
        }
        for (int i = 0; high_ > low_ && i <= cells; ++i)
            value_.push_back(energy_yield(law, low_ + (high_ - low_) * i / cells));
    }
    double operator()(double energy) const {
        if (value_.empty() || energy < low_ || energy >= high_) return energy_yield(law_, energy);
        const double x = (energy - low_) / (high_ - low_) * cells;
        const int i = std::min(static_cast<int>(x), cells - 1);
        return value_[i] + (x - i) * (value_[i + 1] - value_[i]);
    }

private:
    static constexpr int cells = 1024;
    EnergyLaw law_;
    double low_, high_;
    std::vector<double> value_;
};

/// Ions that arrive: where they come from and what they weigh.
struct Arrival {
    double up = 0;     ///< component of the reverse direction along +z
    double along = 0;  ///< and along the horizontal part of the element's normal; revolved: along x
    double weight = 0; ///< share of the flux / up
    double energy = 0;
    int batch = 0;
};

/// Species that arrive alike (the mass of an ion does not matter in a collisionless sheath) share
/// directions and what these see.
struct Group {
    IonDistribution distribution;
    std::vector<double> content;
    std::vector<int> ions;
};

/// A yield apart from its scale, for one group: tallies are multiples of kernels.
struct Kernel {
    int group;
    std::vector<double> content;
    EnergyTable energy;
    int angle; ///< index of the table of the angle law
};

class FullGather {
public:
    FullGather(const geometry::Domain& domain, const geometry::Surface& surface,
               const geometry::RayCaster& caster, const IonTables& tables,
               const DirectIons::Options& options)
        : domain_(domain), surface_(surface), caster_(caster), tables_(tables), options_(options),
          average_(arc_average(domain, surface)), normal_(averaged_normals(surface, average_)),
          per_batch_((std::max(options.directions, 1) + batches - 1) / batches) {
        for (double a : tables.angles()) {
            cosine_.push_back(std::cos(a));
            sine_.push_back(std::sin(a));
        }
        for (std::size_t s = 0; s < tables.ions().size(); ++s)
            join_group(static_cast<int>(s));
        for (const Tally& tally : tables.tallies())
            join_kernel(tally);
    }

    /// Group after group, so that unaveraged rows are held of one group only.
    DirectIons::Gathered run() {
        const std::size_t count = surface_.size(), angles = cosine_.size();
        gathered_.rays_per_batch = per_batch_;
        gathered_.group_of = group_of_;
        gathered_.seen.resize(groups_.size());
        gathered_.row.resize(kernels_.size());
        gathered_.tally.assign(tables_.tallies().size(), std::vector<double>(count));
        gathered_.batch.assign(tables_.tallies().size(), std::vector<double>(count * batches));
        std::vector<std::vector<double>> group_flux(groups_.size(), std::vector<double>(count));
        raw_row_.resize(kernels_.size());
        raw_batch_.resize(kernels_.size());
        for (int g = 0; g < static_cast<int>(groups_.size()); ++g) {
            gathered_.seen[g].resize(count * batches * per_batch_);
            for_kernels(g, [&](std::size_t n) {
                raw_row_[n].assign(count * angles, 0);
                raw_batch_[n].assign(count * batches, 0);
                gathered_.row[n].resize(count * angles);
            });
            over_elements([&](int e) { tabulate(g, e, trace(g, e, group_flux[g][e])); });
            over_elements([&](int e) { average(g, e); });
            for_kernels(g, [&](std::size_t n) {
                std::vector<float>().swap(raw_row_[n]);
                std::vector<double>().swap(raw_batch_[n]);
            });
        }
        for (std::size_t s = 0; s < group_of_.size(); ++s) {
            gathered_.flux.push_back(group_flux[group_of_[s]]);
            for (double& flux : gathered_.flux.back())
                flux *= tables_.ions()[s].flux;
        }
        return std::move(gathered_);
    }

private:
    template <class Work>
    void over_elements(const Work& work) const {
        tbb::parallel_for(tbb::blocked_range<int>(0, static_cast<int>(surface_.size()), 16),
                          [&](const tbb::blocked_range<int>& range) {
                              for (int e = range.begin(); e != range.end(); ++e)
                                  work(e);
                          });
    }

    template <class Work>
    void for_kernels(int group, const Work& work) const {
        for (std::size_t n = 0; n < kernels_.size(); ++n)
            if (kernels_[n].group == group) work(n);
    }

    void join_group(int ion) {
        const IonDistribution& distribution = tables_.ions()[ion].distribution;
        std::vector<double> content;
        distribution.append_content(content);
        const auto same = std::find_if(groups_.begin(), groups_.end(),
                                       [&](const Group& g) { return g.content == content; });
        group_of_.push_back(static_cast<int>(same - groups_.begin()));
        if (same == groups_.end()) groups_.push_back({distribution, std::move(content), {}});
        groups_[group_of_.back()].ions.push_back(ion);
    }

    void join_kernel(const Tally& tally) {
        const int group = group_of_[tally.ion];
        std::vector<double> content;
        append_content(tally.yield, content);
        const auto same = std::find_if(kernels_.begin(), kernels_.end(), [&](const Kernel& k) {
            return k.group == group && k.content == content;
        });
        gathered_.row_of.push_back(static_cast<int>(same - kernels_.begin()));
        gathered_.factor.push_back(tables_.ions()[tally.ion].flux * tally.yield.scale);
        if (same != kernels_.end()) return;
        const AngleTable table(tally.yield.angle);
        const auto known = std::find(angle_factor_.begin(), angle_factor_.end(), table);
        const int angle = static_cast<int>(known - angle_factor_.begin());
        if (known == angle_factor_.end()) angle_factor_.push_back(table);
        kernels_.push_back({group, std::move(content),
                            EnergyTable(tally.yield.energy, groups_[group].distribution), angle});
    }

    /// One ray per direction; adds up the flux, in units of the open flux.
    std::vector<Arrival> trace(int group, int e, double& flux) {
        DirectIons::SeenRay* seen_rays =
            gathered_.seen[group].data() + std::size_t(e) * batches * per_batch_;
        const Vec3 mean = normal_[e];
        const double flat = domain_.revolved() ? 0 : std::hypot(mean.x, mean.y);
        const double hx = flat > 1e-9 ? mean.x / flat : 1.0, hy = flat > 1e-9 ? mean.y / flat : 0.0;
        const double share = 1.0 / (per_batch_ * batches);
        std::vector<Arrival> arrivals;
        arrivals.reserve(std::size_t(per_batch_) * batches);
        for (int b = 0; b < batches; ++b) {
            for (int k = 0; k < per_batch_; ++k) {
                const auto [at, ion] =
                    sky_ray(surface_, groups_[group].distribution, options_, e, group, b, k);
                const Vec3 from = -ion.direction;
                const double facing = from.dot(at.normal);
                const bool seen = facing > 0 ? caster_.opens(at.point, from, e)
                                             : reached_from_behind(e, at.point, from);
                if (!seen) continue;
                if (facing > 0) {
                    flux += share * facing / from.z;
                    seen_rays[std::size_t(b) * per_batch_ + k] = {
                        static_cast<float>(facing / from.z), static_cast<float>(mean.dot(from))};
                }
                arrivals.push_back(
                    {from.z, from.x * hx + from.y * hy, share / from.z, ion.energy_ev, b});
            }
        }
        return arrivals;
    }

    /// A direction behind the element's own plane matters only for turned normals, next to a convex
    /// edge: an ion from there must get within a cell and a half of the element.
    bool reached_from_behind(int e, const Vec3& at, const Vec3& from) const {
        if (domain_.revolved()) return turns_towards(e, from) && reached_in_round_cell(at, from);
        const double path = (caster_.z_open() - at.z) / from.z;
        Vec3 origin = at + from * path, direction = -from;
        fold(origin.x, direction.x, domain_.x_min(), domain_.width_x());
        fold(origin.y, direction.y, domain_.y_min(), domain_.width_y());
        const Hit hit = caster_.trace(origin, direction, -1);
        return hit.kind == Hit::Kind::surface && hit.distance > path - 1.5 * domain_.spacing;
    }
    /// Whether the contour turns towards a direction within four cells of an element, so that an
    /// ion from there may get as near.
    bool turns_towards(int e, const Vec3& from) const {
        for (const bool back : {false, true}) {
            double way = 0;
            for (int f = e; f >= 0 && way < 4 * domain_.spacing;
                 f = back ? surface_.previous[f] : surface_.next[f]) {
                if (surface_.normal[f].dot(from) > 0) return true;
                way += surface_.length(f);
            }
        }
        return false;
    }
    /// reached_from_behind where the side is a cylinder: back along the way, with its reflections
    /// there, to where it comes from the open.
    bool reached_in_round_cell(const Vec3& at, const Vec3& from) const {
        constexpr int most_reflections = 16; // more: it comes along the horizon
        const double path = (caster_.z_open() - at.z) / from.z, radius = domain_.width_x();
        Vec3 start = at, back = from;
        double left = path;
        for (int n = 0; n <= most_reflections; ++n) {
            const double square = back.x * back.x + back.y * back.y;
            const double along = start.x * back.x + start.y * back.y;
            const double within = radius * radius - start.x * start.x - start.y * start.y;
            const double leaves =
                square > 0
                    ? (std::sqrt(along * along + square * std::max(0.0, within)) - along) / square
                    : left;
            start += back * std::min(left, leaves);
            if (leaves >= left) {
                const Hit hit = caster_.trace(start, -back, -1);
                return hit.kind == Hit::Kind::surface &&
                       hit.distance > path - 1.5 * domain_.spacing;
            }
            left -= leaves;
            const Vec3 outwards = Vec3(start.x, start.y, 0).normalized();
            back -= outwards * (2 * outwards.dot(back));
        }
        return false;
    }
    void fold(double& at, double& direction, double low, double width) const {
        const double periods = domain_.sides == geometry::Sides::mirror ? 2 * width : width;
        at -= low + periods * std::floor((at - low) / periods);
        if (at > width) {
            at = 2 * width - at;
            direction = -direction;
        }
        at += low;
    }

    double own_angle(int e) const {
        const Vec3& n = normal_[e];
        return domain_.revolved() ? std::atan2(n.x, n.z) : std::acos(std::clamp(n.z, -1.0, 1.0));
    }

    /// Raw rows of the kernels of a group, and what the batches say at the element's own normal.
    void tabulate(int group, int e, const std::vector<Arrival>& arrivals) {
        const std::size_t angles = cosine_.size(), laws = angle_factor_.size();
        const double own_c = std::cos(own_angle(e)), own_s = std::sin(own_angle(e));
        std::vector<double> received(laws * angles), own(laws);
        std::vector<double> rows(kernels_.size() * angles, 0.0);
        for (const Arrival& a : arrivals) {
            const double own_cosine = std::max(0.0, own_c * a.up + own_s * a.along);
            for (std::size_t l = 0; l < laws; ++l)
                own[l] = own_cosine * angle_factor_[l](own_cosine);
            for (std::size_t k = 0; k < angles; ++k) {
                const double c = cosine_[k] * a.up + sine_[k] * a.along;
                for (std::size_t l = 0; l < laws; ++l)
                    received[l * angles + k] = c > 0 ? c * angle_factor_[l](c) : 0.0;
            }
            for (std::size_t n = 0; n < kernels_.size(); ++n) {
                if (kernels_[n].group != group) continue;
                const double strength = a.weight * kernels_[n].energy(a.energy);
                raw_batch_[n][std::size_t(e) * batches + a.batch] +=
                    batches * strength * own[kernels_[n].angle];
                const double* from = received.data() + kernels_[n].angle * angles;
                double* row = rows.data() + n * angles;
                for (std::size_t k = 0; k < angles; ++k)
                    row[k] += strength * from[k];
            }
        }
        for (std::size_t n = 0; n < kernels_.size(); ++n)
            if (kernels_[n].group == group)
                std::copy_n(rows.data() + n * angles, angles,
                            raw_row_[n].data() + std::size_t(e) * angles);
    }

    /// Averages over the surroundings: a wall takes so little of the beam that the noise of one
    /// element's directions would roughen it.
    void average(int group, int e) {
        const std::size_t angles = cosine_.size();
        std::vector<double> row(angles);
        std::array<double, batches> batch;
        for_kernels(group, [&](std::size_t n) {
            std::fill(row.begin(), row.end(), 0.0);
            batch.fill(0.0);
            for (int i = average_.first[e]; i < average_.first[e + 1]; ++i) {
                const auto [f, weight] = average_.parts[i];
                const float* from = raw_row_[n].data() + std::size_t(f) * angles;
                for (std::size_t k = 0; k < angles; ++k)
                    row[k] += weight * from[k];
                for (int b = 0; b < batches; ++b)
                    batch[b] += weight * raw_batch_[n][std::size_t(f) * batches + b];
            }
            float* to = gathered_.row[n].data() + std::size_t(e) * angles;
            for (std::size_t k = 0; k < angles; ++k)
                to[k] = static_cast<float>(row[k]);
            const double own = on_row(tables_.angles(), to, own_angle(e));
            // Batches spread about the same mean.
            double mean = 0;
            for (const double value : batch)
                mean += value / batches;
            for (double& value : batch)
                value = mean > 0 ? value * own / mean : own;
            add_tallies(static_cast<int>(n), e, own, batch);
        });
    }

    /// Files what a kernel gives at an element's own normal under the tallies that it stands for.
    void add_tallies(int kernel, int e, double own, const std::array<double, batches>& batch) {
        for (std::size_t m = 0; m < gathered_.row_of.size(); ++m) {
            if (gathered_.row_of[m] != kernel) continue;
            gathered_.tally[m][e] = gathered_.factor[m] * own;
            for (int b = 0; b < batches; ++b)
                gathered_.batch[m][std::size_t(e) * batches + b] = gathered_.factor[m] * batch[b];
        }
    }

    const geometry::Domain& domain_;
    const geometry::Surface& surface_;
    const geometry::RayCaster& caster_;
    const IonTables& tables_;
    const DirectIons::Options& options_;
    ArcAverage average_;
    std::vector<Vec3> normal_;
    int per_batch_;
    std::vector<Group> groups_;
    std::vector<int> group_of_; ///< of each ion
    std::vector<Kernel> kernels_;
    std::vector<AngleTable> angle_factor_;
    std::vector<double> cosine_, sine_;
    std::vector<std::vector<float>> raw_row_;    ///< [kernel][e * angles + k]
    std::vector<std::vector<double>> raw_batch_; ///< [kernel][e * 8 + b]
    DirectIons::Gathered gathered_;
};

} // namespace

DirectIons::SkyRay sky_ray(const geometry::Surface& surface, const IonDistribution& distribution,
                           const DirectIons::Options& options, int e, int group, int batch, int k) {
    const ScrambledPoints points(
        stream_key(options.seed, stream, options.refresh, e, group, batch));
    const auto index = static_cast<std::uint32_t>(k);
    // Spread over the element, so that the flux is its mean and not that of its centre.
    const auto place = points.pair(index, 2);
    return {launch_from(surface, e, place[0], place[1]), distribution.sample(points.four(index))};
}

DirectIons::Gathered gather_full(const geometry::Domain& domain, const geometry::Surface& surface,
                                 const geometry::RayCaster& caster, const IonTables& tables,
                                 const DirectIons::Options& options) {
    return FullGather(domain, surface, caster, tables, options).run();
}

} // namespace rille::fluxes
