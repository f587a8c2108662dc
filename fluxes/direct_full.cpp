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

private:
    static constexpr int cells = 2048;
    std::vector<double> value_;
};

/// An ion that arrives: where it comes from and what it weighs.
struct Arrival {
    double up = 0;     ///< component of the reverse direction along +z
    double along = 0;  ///< and along the horizontal part of the element's normal
    double weight = 0; ///< flux / (directions * up)
    double energy = 0;
    int batch = 0;
};

class FullGather {
public:
    FullGather(const geometry::Domain& domain, const geometry::Surface& surface,
               const geometry::RayCaster& caster, const IonTables& tables,
               const DirectIons::Options& options)
        : domain_(domain), surface_(surface), caster_(caster), tables_(tables), options_(options),
          average_(arc_average(domain, surface)), normal_(averaged_normals(surface, average_)),
          per_batch_((std::max(options.directions, 1) + batches - 1) / batches) {
        for (const Tally& tally : tables.tallies())
            angle_factor_.emplace_back(tally.yield.angle);
        for (double a : tables.angles()) {
            cosine_.push_back(std::cos(a));
            sine_.push_back(std::sin(a));
        }
    }

    DirectIons::Gathered run() {
        const std::size_t count = surface_.size(), tallies = tables_.tallies().size();
        gathered_.flux.assign(tables_.ions().size(), std::vector<double>(count, 0.0));
        gathered_.row.assign(tallies, std::vector<float>(count * cosine_.size(), 0.0F));
        gathered_.tally.assign(tallies, std::vector<double>(count, 0.0));
        gathered_.batch.assign(tallies, std::vector<double>(count * batches, 0.0));
        tbb::parallel_for(tbb::blocked_range<int>(0, static_cast<int>(count), 16),
                          [&](const tbb::blocked_range<int>& range) {
                              for (int e = range.begin(); e != range.end(); ++e)
                                  for (std::size_t s = 0; s < tables_.ions().size(); ++s)
                                      gather(e, static_cast<int>(s));
                          });
        return std::move(gathered_);
    }

private:
    void gather(int e, int ion) {
        const std::vector<Arrival> arrivals = trace(e, ion);
        for (std::size_t m = 0; m < tables_.tallies().size(); ++m)
            if (tables_.tallies()[m].ion == ion) tabulate(static_cast<int>(m), e, arrivals);
    }

    /// One ray per direction.
    std::vector<Arrival> trace(int e, int ion) {
        const IonSource& source = tables_.ions()[ion];
        const Vec3 mean = normal_[e];
        const double flat = std::hypot(mean.x, mean.y);
        const double hx = flat > 1e-9 ? mean.x / flat : 1.0, hy = flat > 1e-9 ? mean.y / flat : 0.0;
        const double share = source.flux / (per_batch_ * batches);
        std::vector<Arrival> arrivals;
        for (int b = 0; b < batches; ++b) {
            const ScrambledPoints points(
                stream_key(options_.seed, stream, options_.refresh, e, ion, b));
            for (int k = 0; k < per_batch_; ++k) {
                const auto index = static_cast<std::uint32_t>(k);
                const IonSample ion_sample = source.distribution.sample(points.four(index));
                // Spread over the element, so that the flux is its mean and not that of its centre.
                const auto place = points.pair(index, 2);
                const Launch at = launch_from_quad(surface_, e, place[0], place[1]);
                const Vec3 from = -ion_sample.direction;
                const double facing = from.dot(at.normal);
                const bool seen = facing > 0
                                      ? caster_.trace(at.point, from, e).kind == Hit::Kind::open
                                      : reached_from_behind(at.point, from);
                if (!seen) continue;
                if (facing > 0) gathered_.flux[ion][e] += share * facing / from.z;
                arrivals.push_back(
                    {from.z, from.x * hx + from.y * hy, share / from.z, ion_sample.energy_ev, b});
            }
        }
        return arrivals;
    }

    /// A direction behind the element's own plane matters only for turned normals, next to a convex
    /// edge: an ion from there must get within a cell and a half of the element.
    bool reached_from_behind(const Vec3& at, const Vec3& from) const {
        const double path = (caster_.z_open() - at.z) / from.z;
        Vec3 origin = at + from * path, direction = -from;
        fold(origin.x, direction.x, domain_.x_min(), domain_.width_x());
        fold(origin.y, direction.y, domain_.y_min(), domain_.width_y());
        const Hit hit = caster_.trace(origin, direction, -1);
        return hit.kind == Hit::Kind::surface && hit.distance > path - 1.5 * domain_.spacing;
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

    void tabulate(int m, int e, const std::vector<Arrival>& arrivals) {
        const YieldFunction& yield = tables_.tallies()[m].yield;
        const AngleTable& factor = angle_factor_[m];
        const std::size_t angles = cosine_.size();
        std::vector<double> row(angles, 0.0);
        const double own_c = std::clamp(normal_[e].z, -1.0, 1.0);
        const double own_s = std::sqrt(1 - own_c * own_c);
        double* batch = &gathered_.batch[m][std::size_t(e) * batches];
        for (const Arrival& a : arrivals) {
            const double strength = a.weight * yield.scale * energy_yield(yield.energy, a.energy);
            if (strength == 0) continue;
            const double own = own_c * a.up + own_s * a.along;
            if (own > 0) batch[a.batch] += batches * strength * own * factor(own);
            for (std::size_t k = 0; k < angles; ++k) {
                const double c = cosine_[k] * a.up + sine_[k] * a.along;
                if (c > 0) row[k] += strength * c * factor(c);
            }
        }
        for (int b = 0; b < batches; ++b)
            gathered_.tally[m][e] += batch[b] / batches;
        for (std::size_t k = 0; k < angles; ++k)
            gathered_.row[m][std::size_t(e) * angles + k] = static_cast<float>(row[k]);
    }

    const geometry::Domain& domain_;
    const geometry::Surface& surface_;
    const geometry::RayCaster& caster_;
    const IonTables& tables_;
    const DirectIons::Options& options_;
    ArcAverage average_;
    std::vector<Vec3> normal_;
    int per_batch_;
    std::vector<AngleTable> angle_factor_;
    std::vector<double> cosine_, sine_;
    DirectIons::Gathered gathered_;
};

} // namespace

DirectIons::Gathered gather_full(const geometry::Domain& domain, const geometry::Surface& surface,
                                 const geometry::RayCaster& caster, const IonTables& tables,
                                 const DirectIons::Options& options) {
    return FullGather(domain, surface, caster, tables, options).run();
}

} // namespace rille::fluxes
