// SPDX-License-Identifier: Apache-2.0
#include "fluxes/ion_tables.hpp"

#include "fluxes/gathered_ions.hpp"
#include "fluxes/ion_laws.hpp"

#include <tbb/blocked_range.h>
#include <tbb/parallel_for.h>

#include <algorithm>
#include <cmath>
#include <initializer_list>

namespace rille::fluxes {
namespace {

constexpr double pi = 3.14159265358979323846;
constexpr double degree = pi / 180;

/// Where a surface turns out of the beam of one ion species.
struct Grazing {
    double at = 0, spread = 0; ///< [rad]
};

/// Spacing wanted at angle psi: a quarter of the spread near grazing incidence (the flux there is
/// spread * (x + ...) with curvature 1 / spread), growing with the distance; yields peak at 50 to
/// 80 deg and need about a degree; the rest is a cosine.
double spacing_at(double psi, const std::vector<Grazing>& grazing, double coarsen) {
    const double tilt = std::fabs(psi) / degree;
    double step = (tilt < 40 ? 2.5 : tilt < 90 ? 1.25 : 6.0) * degree;
    for (const Grazing& g : grazing) {
        const double off = std::max(0.0, std::fabs(psi - g.at) - 1.5 * g.spread);
        step = std::min(step, 0.25 * (g.spread + off));
    }
    return coarsen * step;
}

/// Angle between the wafer normal and the mean flight of the ions [rad].
double tilt_of(const IonDistribution& ions) {
    Vec3 sum(0, 0, 0);
    for (const IonArc& arc : ions.arcs())
        sum += (arc.from + arc.to) * arc.weight;
    return std::atan2(std::hypot(sum.x, sum.y), -sum.z);
}

std::vector<double> march(double from, double to, const std::vector<Grazing>& grazing,
                          double coarsen) {
    std::vector<double> stops = {from, to};
    for (const Grazing& g : grazing)
        if (g.at > from && g.at < to) stops.push_back(g.at);
    std::sort(stops.begin(), stops.end());
    std::vector<double> angles = {from};
    for (std::size_t s = 1; s < stops.size(); ++s) {
        const double begin = angles.back(), end = stops[s];
        if (!(end - begin > 1e-9)) continue;
        std::vector<double> walk = {begin};
        while (walk.back() < end) {
            const double here = spacing_at(walk.back(), grazing, coarsen);
            walk.push_back(walk.back() +
                           std::min(here, spacing_at(walk.back() + here, grazing, coarsen)));
        }
        const double stretch = (end - begin) / (walk.back() - begin);
        for (std::size_t i = 1; i + 1 < walk.size(); ++i)
            angles.push_back(begin + (walk[i] - begin) * stretch);
        angles.push_back(end);
    }
    return angles;
}

struct AppendYield {
    std::vector<double>& to;

    void operator()(const SquareRootLaw& l) const { put({0, l.amplitude, l.threshold_ev}); }
    void operator()(const YamamuraTawaraLaw& l) const {
        put({1, l.z1, l.m1, l.z2, l.m2, l.us_ev, l.q, l.w, l.s});
    }
    void operator()(const BohdanskyLaw& l) const { put({2, l.q, l.etf_ev, l.threshold_ev}); }
    void operator()(const EcksteinLaw& l) const {
        put({3, l.lambda, l.q, l.mu, l.eps_per_ev, l.threshold_ev});
    }
    void operator()(const ConstantLaw& l) const { put({4, l.value}); }
    void operator()(const LinearLaw& l) const { put({5, l.per_ev}); }
    void operator()(const FlatAngle&) const { put({0}); }
    void operator()(const PlateauCosine& l) const { put({1, l.plateau_deg}); }
    void operator()(const PlateauLinear& l) const { put({2, l.plateau_deg}); }
    void operator()(const YamamuraAngle& l) const { put({3, l.f, l.optimum_deg}); }
    void put(std::initializer_list<double> numbers) const { to.insert(to.end(), numbers); }
};

} // namespace

void append_content(const YieldFunction& yield, std::vector<double>& numbers) {
    std::visit(AppendYield{numbers}, yield.energy);
    std::visit(AppendYield{numbers}, yield.angle);
}

namespace {

std::vector<double> content_of(geometry::Symmetry symmetry, const std::vector<IonSource>& ions,
                               const std::vector<Tally>& tallies) {
    std::vector<double> content = {static_cast<double>(symmetry), static_cast<double>(ions.size())};
    for (const IonSource& ion : ions) {
        content.push_back(ion.flux);
        ion.distribution.append_content(content);
    }
    for (const Tally& tally : tallies) {
        content.push_back(tally.ion);
        content.push_back(tally.yield.scale);
        append_content(tally.yield, content);
    }
    return content;
}

} // namespace

IonTables::IonTables(geometry::Symmetry symmetry, std::vector<IonSource> ions,
                     std::vector<Tally> tallies)
    : ions_(std::move(ions)), tallies_(std::move(tallies)),
      content_(content_of(symmetry, ions_, tallies_)) {
    place_angles(symmetry);
    if (symmetry != geometry::Symmetry::extruded) return;
    for (int s = 0; s < static_cast<int>(ions_.size()); ++s)
        plane_.push_back(fluxes::plane_table(in_plane(s)));
    for (const Tally& tally : tallies_)
        table_.push_back(tabulate(tally));
    for (int s = 0; s < static_cast<int>(ions_.size()); ++s)
        table_.push_back(tabulate({s, {ConstantLaw{1.0}, FlatAngle{}, 1.0}}));
}

bool IonTables::serves(geometry::Symmetry symmetry, const std::vector<IonSource>& ions,
                       const std::vector<Tally>& tallies) const {
    return content_ == content_of(symmetry, ions, tallies);
}

void IonTables::place_angles(geometry::Symmetry symmetry) {
    const bool extruded = symmetry == geometry::Symmetry::extruded;
    const bool contour = symmetry != geometry::Symmetry::full; // angles are signed
    std::vector<Grazing> grazing;
    const auto add = [&](double at, double spread) {
        spread = std::clamp(spread, 0.1 * degree, 10 * degree);
        const bool known = std::any_of(grazing.begin(), grazing.end(), [&](const Grazing& g) {
            return std::fabs(g.at - at) < 0.1 * spread && g.spread <= spread;
        });
        if (!known) grazing.push_back({at, spread});
    };
    for (const IonSource& ion : ions_) {
        for (const IonSpread& bundle : ion.distribution.spreads()) {
            if (contour) add(bundle.mean - 0.5 * pi, bundle.spread);
            add(bundle.mean + 0.5 * pi, bundle.spread);
        }
        if (contour) continue;
        // Walls of every azimuth meet a leaning beam between 90 deg less and 90 deg more its tilt.
        const double tilt = tilt_of(ion.distribution);
        for (double part : {-1.0, -0.5, 0.0, 0.5, 1.0})
            if (tilt > 0.1 * degree) add(0.5 * pi + part * tilt, 0.5 * tilt);
    }
    // Ions without a preferred side: angles without one, so that mirror images stay so.
    const bool even = contour && std::all_of(ions_.begin(), ions_.end(), [](const IonSource& ion) {
                          return std::fabs(ion.distribution.mean_rad()) < 1e-9;
                      });
    const double from = contour && !even ? -pi : 0.0;
    const std::size_t most = extruded ? 240 : contour ? 128 : 64;
    for (double coarsen = 1;; coarsen *= 1.1) {
        std::vector<double> angles = march(from, pi, grazing, coarsen);
        if (even) {
            angles_.clear();
            for (auto a = angles.rbegin(); *a > 0; ++a)
                angles_.push_back(-*a);
            angles_.insert(angles_.end(), angles.begin(), angles.end());
        } else {
            angles_ = std::move(angles);
        }
        if (angles_.size() <= most) break;
    }
}

std::vector<double> IonTables::tabulate(const Tally& t) const {
    const IonSource& ion = ions_[t.ion];
    const InPlane& plane = ion.distribution.in_plane();
    std::vector<double> energy;
    for (const auto& spectrum : plane.spectra) {
        double sum = 0;
        for (const auto& e : spectrum)
            sum += e.share * energy_yield(t.yield.energy, e.energy_ev);
        energy.push_back(sum * t.yield.scale * ion.flux);
    }
    const GatheredIons gathered(plane, energy);
    const AngleTable factor(t.yield.angle);
    const std::size_t count = angles_.size();
    std::vector<double> table(plane.angle.size() * count, 0.0);
    tbb::parallel_for(tbb::blocked_range<std::size_t>(0, count), [&](const auto& range) {
        for (std::size_t k = range.begin(); k != range.end(); ++k) {
            const double c = std::cos(angles_[k]), s = std::sin(angles_[k]);
            for (std::size_t b = 0; b < gathered.bins(); ++b)
                table[(b + 1) * count + k] =
                    table[b * count + k] + gathered.on_surface(b, c, s, factor);
        }
    });
    return table;
}

void IonTables::add(int tally, const InPlane::Place& place, double factor, std::size_t first,
                    std::size_t end, double* row) const {
    const std::size_t count = angles_.size();
    const double* low = table_[tally].data() + place.bin * count;
    const double* high = low + count;
    const double a = factor * (1 - place.part), b = factor * place.part;
    for (std::size_t k = first; k < end; ++k)
        row[k] += a * low[k] + b * high[k];
}

} // namespace rille::fluxes
