// SPDX-License-Identifier: Apache-2.0
#include "fluxes/ion_gather.hpp"
#include "fluxes/open_sky.hpp"

#include <tbb/blocked_range.h>
#include <tbb/parallel_for.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <numeric>

namespace rille::fluxes {
namespace {

/// Two-point Gauss rule along a segment.
constexpr std::array<double, 2> gauss = {0.21132486540518712, 0.7886751345948129};

class ExtrudedGather : public IonGather {
public:
    ExtrudedGather(const geometry::Domain& domain, const geometry::Surface& surface,
                   const IonTables& tables, const WantedSums& wanted)
        : IonGather(domain, surface, wanted), surface_(surface), tables_(tables), wanted_(wanted),
          sky_(domain, surface), seen_(surface.size()) {
        const std::size_t count = surface_.size(), ions = tables_.ions().size();
        for (const double angle : tables_.angles())
            turned_over_.push_back(angle_node(tables_.angles(), -angle));
        flux_.assign(ions, std::vector<double>(count, 0.0));
        over_elements([&](int e) {
            for (double part : gauss)
                for (const Visible& v : sky_.visible(e, part))
                    seen_[e].push_back(v);
            for (std::size_t s = 0; s < ions; ++s)
                flux_[s][e] =
                    tables_.ions()[s].flux * sky_.flux(tables_.in_plane(static_cast<int>(s)), e);
        });
        choose_nodes();
        // Side by side as well as element by element: single loops over a contour are short.
        places_.resize(ions);
        flux_row_.resize(ions);
        own_flux_.assign(ions, std::vector<double>(count));
        tbb::parallel_for(std::size_t(0), ions, [&](std::size_t s) {
            places_[s] = places(s);
            const std::vector<char> everywhere(count, 1);
            flux_row_[s] =
                averaged_rows(tables_.flux_tally(static_cast<int>(s)), places_[s], everywhere);
            over_elements([&](int e) {
                own_flux_[s][e] = on_row(&flux_row_[s][e * tables_.angles().size()], own_angle(e));
            });
        });
        row_.resize(tables_.tallies().size());
        tbb::parallel_for(std::size_t(0), row_.size(),
                          [&](std::size_t m) { tabulate(static_cast<int>(m)); });
        over_elements([&](int e) { sum_own(e); });
    }

    double flux(int ion, int e) const override { return flux_[ion][e]; }
    void visit_rows(const DirectIons::UseRows& use) const override {
        const std::size_t angles = tables_.angles().size(), sums = wanted_.members.size();
        std::vector<int> place(sums);
        std::iota(place.begin(), place.end(), 0);
        over_elements([&](int e) {
            std::vector<double> rows(sums * angles, 0.0);
            for (std::size_t s = 0; s < sums; ++s)
                for (const int m : wanted_.members[s])
                    for (int k = nodes_[e].first; k < nodes_[e].end; ++k)
                        rows[s * angles + k] += row_[m][e * angles + k];
            use(e, {rows.data(), place.data(), angles, nodes_[e]});
        });
    }

private:
    template <class Work>
    void over_elements(const Work& work) const {
        tbb::parallel_for(tbb::blocked_range<int>(0, static_cast<int>(surface_.size()), 64),
                          [&](const tbb::blocked_range<int>& range) {
                              for (int e = range.begin(); e != range.end(); ++e)
                                  work(e);
                          });
    }

    double own_angle(int e) const { return std::atan2(normal_[e].x, normal_[e].z); }

    /// Of every element's visible intervals, in the in-plane distribution of one ion.
    struct Seen {
        InPlane::Place low, high;
    };
    std::vector<std::vector<Seen>> places(std::size_t ion) const {
        const InPlane& plane = tables_.in_plane(static_cast<int>(ion));
        std::vector<std::vector<Seen>> seen(seen_.size());
        over_elements([&](int e) {
            for (const Visible& v : seen_[e])
                seen[e].push_back({plane.place(v.low), plane.place(v.high)});
        });
        return seen;
    }

    /// Calls work(f, whether its image is meant) for every f that the average at e takes from.
    template <class Work>
    void over_parts(int e, const Work& work) const {
        for (int i = average_->first[e]; i < average_->first[e + 1]; ++i)
            work(average_->parts[i].element, average_->parts[i].image);
    }

    /// Nodes of the wanted rows, and of those that their averages are made of (all for images,
    /// which turn the angles over).
    void choose_nodes() {
        const int angles = static_cast<int>(tables_.angles().size());
        nodes_ = wanted_.nodes;
        if (nodes_.empty()) nodes_.assign(surface_.size(), {0, angles});
        single_nodes_.assign(surface_.size(), {angles, 0});
        for (std::size_t e = 0; e < nodes_.size(); ++e)
            over_parts(static_cast<int>(e), [&](int f, bool image) {
                const NodeRange nodes = image ? NodeRange{0, angles} : nodes_[e];
                single_nodes_[f].first = std::min(single_nodes_[f].first, nodes.first);
                single_nodes_[f].end = std::max(single_nodes_[f].end, nodes.end);
            });
    }

    /// Per element, whether a material in its reach wants the tally.
    std::vector<char> wanting(int tally) const {
        std::vector<char> by_material;
        for (const std::vector<int>& sums : wanted_.of_material)
            by_material.push_back(std::any_of(sums.begin(), sums.end(), [&](int sum) {
                const std::vector<int>& members = wanted_.members[sum];
                return std::find(members.begin(), members.end(), tally) != members.end();
            }));
        std::vector<char> wants(surface_.size(), 0);
        const MaterialsInReach& reach = *wanted_.reach;
        for (std::size_t e = 0; e < wants.size(); ++e)
            for (int i = reach.first[e]; i < reach.first[e + 1]; ++i)
                wants[e] |= by_material[reach.material[i]];
        return wants;
    }

    /// Rows of one table, where they are wanted: per element from its visible intervals, then
    /// averaged along the arc.
    std::vector<float> averaged_rows(int table, const std::vector<std::vector<Seen>>& seen,
                                     const std::vector<char>& wants) const {
        const std::size_t count = surface_.size(), angles = tables_.angles().size();
        std::vector<char> takes_part(count, 0);
        for (std::size_t e = 0; e < count; ++e)
            if (wants[e]) over_parts(static_cast<int>(e), [&](int f, bool) { takes_part[f] = 1; });
        std::vector<float> single(count * angles);
        over_elements([&](int e) {
            if (!takes_part[e]) return;
            const auto [first, end] = single_nodes_[e];
            std::vector<double> row(angles, 0.0);
            for (const Seen& s : seen[e]) {
                tables_.add(table, s.high, 1.0 / gauss.size(), first, end, row.data());
                tables_.add(table, s.low, -1.0 / gauss.size(), first, end, row.data());
            }
            for (int k = first; k < end; ++k)
                single[e * angles + k] = static_cast<float>(std::max(0.0, row[k]));
        });
        std::vector<float> rows(count * angles);
        over_elements([&](int e) {
            if (!wants[e]) return;
            const auto [first, end] = nodes_[e];
            std::vector<double> row(angles, 0.0);
            for (int i = average_->first[e]; i < average_->first[e + 1]; ++i) {
                const auto& [element, image, weight] = average_->parts[i];
                const float* part = &single[element * angles];
                for (int k = first; k < end; ++k)
                    row[k] += weight * (image ? at_node(part, turned_over_[k]) : part[k]);
            }
            for (int k = first; k < end; ++k)
                rows[e * angles + k] = static_cast<float>(row[k]);
        });
        return rows;
    }

    /// Rows of one tally, brought to the flux that the elements of the average really receive.
    void tabulate(int m) {
        const std::size_t angles = tables_.angles().size();
        const int ion = tables_.tallies()[m].ion;
        const std::vector<char> wants = wanting(m);
        row_[m] = averaged_rows(m, places_[ion], wants);
        over_elements([&](int e) {
            if (!wants[e]) return;
            float* row = &row_[m][e * angles];
            const float* flux = &flux_row_[ion][e * angles];
            const double own = own_flux_[ion][e];
            const double missing = average_->of(flux_[ion], e) - own;
            for (int k = nodes_[e].first; k < nodes_[e].end; ++k)
                row[k] = static_cast<float>(row[k] * correction(missing, own, flux[k]));
        });
    }

    static double at_node(const float* row, const AngleNode& at) {
        return row[at.node] + at.part * (double(row[at.node + 1]) - row[at.node]);
    }
    double on_row(const float* row, double angle) const {
        return at_node(row, angle_node(tables_.angles(), angle));
    }
    void sum_own(int e) {
        const std::vector<int>& sums = wanted_.of(e);
        for (std::size_t i = 0; i < sums.size(); ++i)
            for (const int m : wanted_.members[sums[i]])
                own_[first_[e] + i] += on_row(&row_[m][e * tables_.angles().size()], own_angle(e));
    }

    /// Brings in the flux that point samples and the averaged normal miss: as an amount where the
    /// turned normal receives more than the own one, in proportion where it receives less; bounded,
    /// so that normals turned out of all beams stay without.
    static double correction(double missing, double own_flux, double flux) {
        const double scale = std::max(own_flux, flux);
        return scale > 0 ? std::clamp(1.0 + missing / scale, 0.5, 2.0) : 1.0;
    }

    const geometry::Surface& surface_;
    const IonTables& tables_;
    const WantedSums& wanted_;
    OpenSky sky_;
    std::vector<AngleNode> turned_over_;  ///< per angle of the tables: where minus that lies
    std::vector<NodeRange> nodes_;        ///< per element, of its rows
    std::vector<NodeRange> single_nodes_; ///< likewise, of what averages take from it
    std::vector<std::vector<Visible>> seen_;
    std::vector<std::vector<std::vector<Seen>>> places_; ///< [ion][e]
    std::vector<std::vector<double>> flux_;              ///< [ion][e]
    std::vector<std::vector<float>> row_;                ///< [tally][e * angles + k] [nm^-2 s^-1]
    std::vector<std::vector<float>> flux_row_;           ///< [ion], likewise
    std::vector<std::vector<double>> own_flux_; ///< [ion][e]: the row at the element's own normal
};

} // namespace

std::unique_ptr<IonGather> gather_extruded(const geometry::Domain& domain,
                                           const geometry::Surface& surface,
                                           const IonTables& tables, const WantedSums& wanted) {
    return std::make_unique<ExtrudedGather>(domain, surface, tables, wanted);
}

} // namespace rille::fluxes
