// SPDX-License-Identifier: Apache-2.0
#include "fluxes/exchange_operator.hpp"
#include "fluxes/ion_gather.hpp"
#include "fluxes/row_kernels.hpp"
#include "fluxes/sampling.hpp"
#include "fluxes/sky_view.hpp"
#include "fluxes/spatial_order.hpp"

#include <tbb/blocked_range.h>
#include <tbb/parallel_for.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <map>

namespace rille::fluxes {
namespace {

using Nodes = RowKernels::Nodes;
using Selection = RowKernels::Selection;

constexpr std::uint64_t stream = 0x64697265637400ULL; ///< keeps keys apart from other samplings
constexpr int chunk_elements = 1024;                  ///< whose rows are held at once

/// Some materials of a run; two that share a bit are taken together.
using Materials = std::uint64_t;
Materials bit_of(int material) {
    return Materials(1) << (material & 63);
}

/// The ions of one group onto one element: the points behind the rays of one batch.
ScrambledPoints points_of(const DirectIons::Options& options, int e, int group, int batch) {
    return ScrambledPoints(stream_key(options.seed, stream, options.refresh, e, group, batch));
}
/// Spread over the element, so that the flux is its mean and not that of its centre.
Launch launch_of(const Launcher& launcher, const ScrambledPoints& points, int k) {
    const auto place = points.pair(static_cast<std::uint32_t>(k), 2);
    return launcher(place[0], place[1]);
}

double on_row(const float* row, const AngleNode& at) {
    const double low = row[at.node], high = row[at.node + 1];
    return low + at.part * (high - low);
}

class FullGather : public IonGather {
public:
    FullGather(const geometry::Domain& domain, const geometry::Surface& surface,
               const geometry::RayCaster& caster, const IonTables& tables, const WantedSums& wanted,
               const DirectIons::Options& options)
        : IonGather(domain, surface, wanted), domain_(domain), surface_(surface), tables_(tables),
          wanted_(wanted), options_(options), kernels_(tables, wanted.members),
          per_batch_((std::max(options.directions, 1) + batches - 1) / batches),
          words_((per_batch_ * batches + 63) / 64) {
        const std::size_t count = surface.size(), groups = kernels_.groups();
        arrives_.assign(count * groups * words_, 0);
        flux_.assign(groups, std::vector<double>(count));
        gather_own(SkyView(domain, surface, caster));
    }

    double flux(int ion, int e) const override {
        return tables_.ions()[ion].flux * flux_[kernels_.group_of(ion)][e];
    }
    int groups() const override { return kernels_.groups(); }
    int group_of(int ion) const override { return kernels_.group_of(ion); }
    int rays_per_batch() const override { return per_batch_; }
    bool arrives(int group, int e, int batch, int k) const override {
        const int ray = batch * per_batch_ + k;
        return words(group, e)[ray / 64] >> (ray % 64) & 1;
    }
    Launch place(const Launcher& launcher, int group, int e, int batch, int k) const override {
        return launch_of(launcher, points_of(options_, e, group, batch), k);
    }
    IonSample ion(int group, int e, int batch, int k) const override {
        const auto index = static_cast<std::uint32_t>(k);
        return kernels_.distribution(group).sample(
            points_of(options_, e, group, batch).four(index));
    }
    void visit_rows(const DirectIons::UseRows&) const override;

private:
    /// What is held of one element until the elements around it are averaged over: its rows about
    /// their normals and its batches, of the sums that are wanted there.
    struct Raw {
        Nodes nodes;
        Materials materials = 0;
        const Selection* selection = nullptr;
        std::size_t row = 0, batch = 0; ///< where they begin
    };

    template <class Work>
    void over_elements(const Work& work) const {
        tbb::parallel_for(tbb::blocked_range<int>(0, static_cast<int>(surface_.size()), 64),
                          [&](const tbb::blocked_range<int>& range) {
                              for (int e = range.begin(); e != range.end(); ++e)
                                  work(e);
                          });
    }
    template <class Work>
    void over_parts(int e, const Work& work) const {
        for (int i = average_->first[e]; i < average_->first[e + 1]; ++i)
            work(average_->parts[i]);
    }
    /// Whether angles of an image count the other way round. In full they are counted towards the
    /// element's own normal, which is turned over with it.
    bool turned(const ArcAverage::Part& part) const { return domain_.revolved() && part.image; }
    AngleNode own_node(int e, bool turn) const {
        return angle_node(tables_.angles(), turn ? -own_angle(e) : own_angle(e));
    }
    const std::uint64_t* words(int group, int e) const {
        return arrives_.data() + (std::size_t(e) * kernels_.groups() + group) * words_;
    }
    double own_angle(int e) const {
        const Vec3& n = normal_[e];
        return domain_.revolved() ? std::atan2(n.x, n.z) : std::acos(std::clamp(n.z, -1.0, 1.0));
    }
    /// Unit vector along the horizontal part of an element's normal; revolved: along x.
    std::array<double, 2> outwards(int e) const {
        const Vec3& n = normal_[e];
        const double flat = domain_.revolved() ? 0 : std::hypot(n.x, n.y);
        return flat > 1e-9 ? std::array{n.x / flat, n.y / flat} : std::array{1.0, 0.0};
    }
    Arrival arrival(const IonSample& ion, const std::array<double, 2>& out, int batch) const {
        const Vec3 from = -ion.direction;
        const double share = 1.0 / (per_batch_ * batches);
        return {from.z, from.x * out[0] + from.y * out[1], share / from.z, ion.energy_ev, batch};
    }
    Selection select(Materials) const;
    std::vector<Raw> plan(std::map<Materials, Selection>&) const;
    void gather_own(const SkyView&);
    void trace(const SkyView&, int e, const Raw&, std::vector<double>& rows,
               std::vector<double>& batch);
    void average(int e, const std::vector<Raw>&, const std::vector<float>& rows,
                 const std::vector<float>& batch);
    void add_again(int e, const Selection&, std::vector<double>& rows) const;

    const geometry::Domain& domain_;
    const geometry::Surface& surface_;
    const IonTables& tables_;
    const WantedSums& wanted_;
    DirectIons::Options options_;
    RowKernels kernels_;
    int per_batch_, words_;
    std::vector<std::uint64_t> arrives_;    ///< [e][group]: a bit of each ray
    std::vector<std::vector<double>> flux_; ///< [group][e], in units of the open flux
};

Selection FullGather::select(Materials materials) const {
    std::vector<int> sums;
    for (std::size_t m = 0; m < wanted_.of_material.size(); ++m)
        if (materials & bit_of(static_cast<int>(m)))
            sums.insert(sums.end(), wanted_.of_material[m].begin(), wanted_.of_material[m].end());
    std::sort(sums.begin(), sums.end());
    sums.erase(std::unique(sums.begin(), sums.end()), sums.end());
    return kernels_.select(sums);
}

/// What the averages at the elements' own normals need of each element.
std::vector<FullGather::Raw> FullGather::plan(std::map<Materials, Selection>& selections) const {
    std::vector<Raw> raw(surface_.size());
    for (int e = 0; e < static_cast<int>(raw.size()); ++e) {
        over_parts(e, [&](const ArcAverage::Part& part) {
            const int f = part.element, node = own_node(e, turned(part)).node;
            Nodes& nodes = raw[f].nodes;
            nodes = nodes.size() == 0
                        ? Nodes{node, node + 2}
                        : Nodes{std::min(nodes.from, node), std::max(nodes.to, node + 2)};
            raw[f].materials |= bit_of(wanted_.reach->outermost(e));
        });
    }
    std::size_t row = 0, batch = 0;
    for (Raw& one : raw) {
        const auto known = selections.find(one.materials);
        one.selection =
            known != selections.end()
                ? &known->second
                : &selections.emplace(one.materials, select(one.materials)).first->second;
        one.row = row;
        one.batch = batch;
        row += one.selection->sums.size() * one.nodes.size();
        batch += one.selection->sums.size() * batches;
    }
    return raw;
}

/// Averages over the surroundings: a wall takes so little of the beam that the noise of one
/// element's directions would roughen it.
void FullGather::gather_own(const SkyView& view) {
    std::map<Materials, Selection> selections;
    const std::vector<Raw> raw = plan(selections);
    if (raw.empty()) return;
    const auto held = [](const Raw& one) { return one.selection->sums.size(); };
    std::vector<float> rows(raw.back().row + held(raw.back()) * raw.back().nodes.size());
    std::vector<float> batch(raw.back().batch + held(raw.back()) * batches);
    over_elements([&](int e) {
        std::vector<double> own_rows(held(raw[e]) * raw[e].nodes.size());
        std::vector<double> own_batch(held(raw[e]) * batches);
        trace(view, e, raw[e], own_rows, own_batch);
        std::copy(own_rows.begin(), own_rows.end(), rows.begin() + raw[e].row);
        std::copy(own_batch.begin(), own_batch.end(), batch.begin() + raw[e].batch);
    });
    batch_.resize(own_.size() * batches);
    over_elements([&](int e) { average(e, raw, rows, batch); });
}

/// One ray per direction; adds up the flux, in units of the open flux.
void FullGather::trace(const SkyView& view, int e, const Raw& raw, std::vector<double>& rows,
                       std::vector<double>& batch) {
    const double cosine = std::cos(own_angle(e)), sine = std::sin(own_angle(e));
    const auto out = outwards(e);
    const Launcher launcher(surface_, e);
    for (int g = 0; g < kernels_.groups(); ++g) {
        std::uint64_t* seen = arrives_.data() + (words(g, e) - arrives_.data());
        for (int b = 0; b < batches; ++b) {
            const ScrambledPoints points = points_of(options_, e, g, b);
            for (int k = 0; k < per_batch_; ++k) {
                const Launch at = launch_of(launcher, points, k);
                const IonSample ion =
                    kernels_.distribution(g).sample(points.four(static_cast<std::uint32_t>(k)));
                const Vec3 from = -ion.direction;
                if (!view.reaches(e, at, from)) continue;
                const int ray = b * per_batch_ + k;
                seen[ray / 64] |= std::uint64_t(1) << (ray % 64);
                const Arrival a = arrival(ion, out, b);
                flux_[g][e] += a.weight * std::max(0.0, from.dot(at.normal));
                kernels_.add(*raw.selection, g, a, raw.nodes, rows);
                kernels_.add_own(*raw.selection, g, a, cosine, sine, batch);
            }
        }
    }
}

void FullGather::average(int e, const std::vector<Raw>& raw, const std::vector<float>& rows,
                         const std::vector<float>& batch) {
    const std::array<AngleNode, 2> nodes{own_node(e, false), own_node(e, true)};
    const std::vector<int>& sums = wanted_.of(e);
    for (std::size_t i = 0; i < sums.size(); ++i) {
        double own = 0;
        std::array<double, batches> spread{};
        over_parts(e, [&](const ArcAverage::Part& part) {
            const auto [f, image, weight] = part;
            const AngleNode& at = nodes[turned(part)];
            const int place = raw[f].selection->place[sums[i]];
            const float* row = rows.data() + raw[f].row + std::size_t(place) * raw[f].nodes.size();
            own += weight * on_row(row, {at.node - raw[f].nodes.from, at.part});
            const float* of = batch.data() + raw[f].batch + std::size_t(place) * batches;
            for (int b = 0; b < batches; ++b)
                spread[b] += weight * of[b];
        });
        own_[first_[e] + i] = own;
        // Batches spread about the same mean.
        double mean = 0;
        for (const double value : spread)
            mean += value / batches;
        for (int b = 0; b < batches; ++b)
            batch_[(std::size_t(first_[e]) + i) * batches + b] =
                mean > 0 ? spread[b] * own / mean : own;
    }
}

/// Rows over all angles from the rays that are known to arrive.
void FullGather::add_again(int e, const Selection& selection, std::vector<double>& rows) const {
    const Nodes all{0, static_cast<int>(tables_.angles().size())};
    const auto out = outwards(e);
    for (int g = 0; g < kernels_.groups(); ++g)
        for (int b = 0; b < batches; ++b) {
            const ScrambledPoints points = points_of(options_, e, g, b);
            for (int k = 0; k < per_batch_; ++k) {
                if (!arrives(g, e, b, k)) continue;
                const IonSample ion =
                    kernels_.distribution(g).sample(points.four(static_cast<std::uint32_t>(k)));
                kernels_.add(selection, g, arrival(ion, out, b), all, rows);
            }
        }
}

/// Elements that lie close together at once, and those that they are averaged over.
void FullGather::visit_rows(const DirectIons::UseRows& use) const {
    const std::vector<int> order = spatial_order(surface_);
    const std::size_t angles = tables_.angles().size();
    std::vector<AngleNode> over; // where the angles lie in rows of images
    for (const double angle : tables_.angles())
        over.push_back(angle_node(tables_.angles(), -angle));
    std::vector<int> local(order.size(), -1), near;
    for (std::size_t begin = 0; begin < order.size(); begin += chunk_elements) {
        const std::size_t end = std::min(order.size(), begin + chunk_elements);
        near.clear();
        Materials materials = 0;
        for (std::size_t i = begin; i < end; ++i) {
            const MaterialsInReach& reach = *wanted_.reach;
            for (int r = reach.first[order[i]]; r < reach.first[order[i] + 1]; ++r)
                materials |= bit_of(reach.material[r]);
            over_parts(order[i], [&](const ArcAverage::Part& part) {
                const int f = part.element;
                if (local[f] >= 0) return;
                local[f] = static_cast<int>(near.size());
                near.push_back(f);
            });
        }
        const Selection selection = select(materials);
        const std::size_t size = selection.sums.size() * angles;
        std::vector<float> rows(near.size() * size);
        using Range = tbb::blocked_range<std::size_t>;
        tbb::parallel_for(Range(0, near.size(), 16), [&](const Range& range) {
            std::vector<double> one(size);
            for (std::size_t i = range.begin(); i != range.end(); ++i) {
                std::fill(one.begin(), one.end(), 0.0);
                add_again(near[i], selection, one);
                std::copy(one.begin(), one.end(), rows.begin() + i * size);
            }
        });
        tbb::parallel_for(Range(begin, end, 16), [&](const Range& range) {
            std::vector<double> mean(size);
            for (std::size_t i = range.begin(); i != range.end(); ++i) {
                std::fill(mean.begin(), mean.end(), 0.0);
                over_parts(order[i], [&](const ArcAverage::Part& part) {
                    const float* from = rows.data() + local[part.element] * size;
                    if (turned(part))
                        for (std::size_t k = 0; k < size; ++k)
                            mean[k] +=
                                part.weight * on_row(from + k - k % angles, over[k % angles]);
                    else
                        for (std::size_t k = 0; k < size; ++k)
                            mean[k] += part.weight * from[k];
                });
                use(order[i], {mean.data(), selection.place.data(), angles, {0, int(angles)}});
            }
        });
        for (const int f : near)
            local[f] = -1;
    }
}

} // namespace

std::unique_ptr<IonGather> gather_full(const geometry::Domain& domain,
                                       const geometry::Surface& surface,
                                       const geometry::RayCaster& caster, const IonTables& tables,
                                       const WantedSums& wanted,
                                       const DirectIons::Options& options) {
    return std::make_unique<FullGather>(domain, surface, caster, tables, wanted, options);
}

} // namespace rille::fluxes
