// SPDX-License-Identifier: Apache-2.0
#include "fluxes/arc_average.hpp"
#include "fluxes/direct_ions.hpp"
#include "fluxes/open_sky.hpp"

#include <tbb/blocked_range.h>
#include <tbb/parallel_for.h>

#include <algorithm>
#include <array>
#include <cmath>

namespace rille::fluxes {
namespace {

/// Two-point Gauss rule along a segment.
constexpr std::array<double, 2> gauss = {0.21132486540518712, 0.7886751345948129};

class ExtrudedGather {
public:
    ExtrudedGather(const geometry::Domain& domain, const geometry::Surface& surface,
                   const IonTables& tables)
        : surface_(surface), tables_(tables), sky_(domain, surface),
          average_(arc_average(domain, surface)), normal_(averaged_normals(surface, average_)),
          seen_(surface.size()) {}

    DirectIons::Gathered run() {
        const std::size_t count = surface_.size(), ions = tables_.ions().size();
        gathered_.flux.assign(ions, std::vector<double>(count, 0.0));
        over_elements([&](int e) {
            for (double part : gauss)
                for (const Visible& v : sky_.visible(e, part))
                    seen_[e].push_back(v);
            for (std::size_t s = 0; s < ions; ++s)
                gathered_.flux[s][e] =
                    tables_.ions()[s].flux * sky_.flux(tables_.in_plane(static_cast<int>(s)), e);
        });
        for (std::size_t s = 0; s < ions; ++s) {
            places_.push_back(places(s));
            flux_row_.push_back(averaged_rows(tables_.flux_tally(static_cast<int>(s)), places_[s]));
            std::vector<double> own(count);
            over_elements([&](int e) {
                own[e] = on_row(tables_.angles(), &flux_row_[s][e * tables_.angles().size()],
                                own_angle(e));
            });
            own_flux_.push_back(std::move(own));
        }
        for (std::size_t m = 0; m < tables_.tallies().size(); ++m)
            tabulate(static_cast<int>(m));
        return std::move(gathered_);
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

    /// Rows of one table: per element from its visible intervals, then averaged along the arc.
    std::vector<float> averaged_rows(int table, const std::vector<std::vector<Seen>>& seen) const {
        const std::size_t count = surface_.size(), angles = tables_.angles().size();
        std::vector<float> raw(count * angles);
        over_elements([&](int e) {
            std::vector<double> row(angles, 0.0);
            for (const Seen& s : seen[e]) {
                tables_.add(table, s.high, 1.0 / gauss.size(), row.data());
                tables_.add(table, s.low, -1.0 / gauss.size(), row.data());
            }
            for (std::size_t k = 0; k < angles; ++k)
                raw[e * angles + k] = static_cast<float>(std::max(0.0, row[k]));
        });
        std::vector<float> rows(count * angles);
        over_elements([&](int e) {
            std::vector<double> row(angles, 0.0);
            for (int i = average_.first[e]; i < average_.first[e + 1]; ++i) {
                const float* part = &raw[average_.parts[i].element * angles];
                const double weight = average_.parts[i].weight;
                for (std::size_t k = 0; k < angles; ++k)
                    row[k] += weight * part[k];
            }
            for (std::size_t k = 0; k < angles; ++k)
                rows[e * angles + k] = static_cast<float>(row[k]);
        });
        return rows;
    }

    /// Rows of one tally, brought to the flux that the elements of the average really receive.
    void tabulate(int m) {
        const std::size_t count = surface_.size(), angles = tables_.angles().size();
        const int ion = tables_.tallies()[m].ion;
        gathered_.row.push_back(averaged_rows(m, places_[ion]));
        gathered_.row_of.push_back(m);
        gathered_.factor.push_back(1.0);
        gathered_.tally.emplace_back(count, 0.0);
        over_elements([&](int e) {
            float* row = &gathered_.row[m][e * angles];
            const float* flux = &flux_row_[ion][e * angles];
            const double own = own_flux_[ion][e];
            const double missing = average_.of(gathered_.flux[ion], e) - own;
            for (std::size_t k = 0; k < angles; ++k)
                row[k] = static_cast<float>(row[k] * correction(missing, own, flux[k]));
            gathered_.tally[m][e] = on_row(tables_.angles(), row, own_angle(e));
        });
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
    OpenSky sky_;
    ArcAverage average_;
    std::vector<geometry::Vec3> normal_;
    std::vector<std::vector<Visible>> seen_;
    std::vector<std::vector<std::vector<Seen>>> places_; ///< [ion][e]
    std::vector<std::vector<float>> flux_row_;           ///< [ion], like Gathered::row
    std::vector<std::vector<double>> own_flux_; ///< [ion][e]: the row at the element's own normal
    DirectIons::Gathered gathered_;
};

} // namespace

DirectIons::Gathered gather_extruded(const geometry::Domain& domain,
                                     const geometry::Surface& surface, const IonTables& tables) {
    return ExtrudedGather(domain, surface, tables).run();
}

} // namespace rille::fluxes
