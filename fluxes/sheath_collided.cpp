// SPDX-License-Identifier: Apache-2.0
#include "fluxes/sheath_collided.hpp"

#include "fluxes/plasma_laws.hpp"
#include "fluxes/sheath_fall.hpp"
#include "fluxes/sheath_trajectories.hpp"

#include <algorithm>
#include <cmath>
#include <utility>

namespace rille::fluxes {
namespace {

using Kind = CollisionProcess::Kind;

constexpr int falls = 1024; ///< entry phases times places, shifted so that both fill their square
constexpr int spectrum_bins = 64, scattered_energies = 32, scattered_angles = 24;

/// Number n of a sequence that fills [0, 1) evenly with others of its family (Weyl's; the steps
/// are powers of the plastic number for two, of the golden ratio for one).
double golden(int n) {
    const double x = 0.5 + 0.6180339887498949 * n;
    return x - std::floor(x);
}
double plastic(int n, int dimension) {
    const double x = 0.5 + (dimension == 0 ? 0.7548776662466927 : 0.5698402909980532) * n;
    return x - std::floor(x);
}

/// Energies along the normal and their weights.
struct Energies {
    std::vector<std::pair<double, double>> list;

    void add(double energy_ev, double weight) {
        if (weight > 0) list.emplace_back(energy_ev, weight);
    }
    double weight() const {
        double sum = 0;
        for (const auto& e : list)
            sum += e.second;
        return sum;
    }
    /// In bins of equal weight, edges half way between neighbours.
    IonDistribution spectrum(double transverse_ev) {
        std::sort(list.begin(), list.end());
        const double top = list.back().first, sliver = 1e-6 * top + 1e-9, all = weight();
        std::vector<double> edges = {std::max(0.0, list.front().first - sliver)}, share = {0};
        for (std::size_t i = 0; i < list.size(); ++i) {
            share.back() += list[i].second;
            if (i + 1 == list.size() || share.back() < all / spectrum_bins) continue;
            const double edge = 0.5 * (list[i].first + list[i + 1].first);
            if (!(edge > edges.back() + sliver)) continue;
            edges.push_back(edge);
            share.push_back(0);
        }
        edges.push_back(std::max(top, edges.back()) + sliver);
        return IonDistribution::falling_spectrum(edges, share, transverse_ev);
    }
};

/// Particles thrown off the normal.
struct Scattered {
    std::vector<Arrival> list;
    std::vector<double> each;

    void add(const SheathFall& ion, double weight) {
        if (!(weight > 0)) return;
        list.push_back({ion.energy_ev(), ion.velocity().across / ion.velocity().along, 0});
        each.push_back(weight);
    }
    double weight() const {
        double sum = 0;
        for (const double w : each)
            sum += w;
        return sum;
    }
    IonDistribution distribution() const {
        return bins_of(list, each, scattered_energies, scattered_angles).distribution();
    }
};

/// A voltage that swings many times during a fall acts by its mean.
Sheath felt(const Sheath& sheath, double mass_amu) {
    constexpr double fastest = 100; // omega tau; a drop then swings by 4 % of the voltage's swing
    Sheath result = sheath;
    const double turns = transit_time_s(sheath, mass_amu) / sheath.voltage.period_s;
    if (!sheath.voltage.is_steady() && 6.28318530717958647692 * turns > fastest)
        result.voltage = Waveform::steady(sheath.voltage.mean());
    return result;
}

class Quadrature {
public:
    Quadrature(const Sheath& sheath, const SheathIon& ion)
        : ion_(ion), field_(felt(sheath, ion.mass_amu), ion.mass_amu), encounters_(ion, field_),
          entry_ev_(entry_energy_ev(sheath) + ion.transverse_ev),
          thermal_ev_(ev_per_kelvin * ion.gas_temperature_k) {
        phases_ = field_.steady() ? 1 : 128;
        places_ = falls / phases_;
    }

    FewCollisions result() {
        if (encounters_.none()) return {};
        for (int phase = 0; phase < phases_; ++phase)
            enter(phase);
        FewCollisions few;
        few.uncollided = uncollided_ / phases_;
        few.uncollided_gain = uncollided_ev_ / uncollided_ / (free_ev_ / phases_);
        // What the law of the last collision gets wrong of the sum.
        const double share = (1 - few.uncollided) / (born_.weight() + deflected_.weight());
        put(few.ions, born_, share, thermal_ev_);
        put(few.ions, deflected_, share);
        put(few.fast_neutrals, neutrals_, 1, ion_.transverse_ev);
        put(few.fast_neutrals, second_neutrals_, 1, thermal_ev_);
        put(few.fast_neutrals, deflected_neutrals_, 1);
        return few;
    }

private:
    static void put(std::vector<FewCollisions::Part>& to, Energies& from, double factor,
                    double transverse_ev) {
        if (from.list.empty()) return;
        to.push_back({factor * from.weight(), from.spectrum(transverse_ev)});
    }
    static void put(std::vector<FewCollisions::Part>& to, const Scattered& from, double factor) {
        if (from.list.empty()) return;
        to.push_back({factor * from.weight(), from.distribution()});
    }

    double normal_ev(const SheathFall& ion) const {
        return field_.energy_ev(ion.velocity().along * ion.velocity().along);
    }

    /// One uncollided ion, and those that start on its way.
    void enter(int phase) {
        SheathFall ion(field_, encounters_);
        const double time = (phase + 0.5) / phases_ * field_.period(), y = field_.first_y();
        const double start_ev = entry_ev_ + field_.entry_gain_ev(time, y);
        ion.start(time, y, {std::sqrt(field_.speed_squared(start_ev)), 0});
        double depth = y * encounters_.rate(entry_ev_);
        for (int place = 0; place < places_; ++place) {
            const double at = std::max(y * 1.001, (place + golden(phase)) / places_);
            depth += ion.fall_to(at);
            collide(ion, std::exp(-depth), phase * places_ + place);
        }
        depth += ion.fall_to(1);
        uncollided_ += std::exp(-depth);
        uncollided_ev_ += std::exp(-depth) * normal_ev(ion);
        free_ev_ += normal_ev(ion);
    }

    /// Both kinds of collision at one place; `first` is the share of ions that come uncollided.
    void collide(const SheathFall& ion, double first, int number) {
        const double piece = 1.0 / (phases_ * places_);
        const double exchanged = piece * encounters_.rate_of(Kind::charge_exchange, normal_ev(ion));
        const double scattered = piece * encounters_.rate_of(Kind::isotropic, normal_ev(ion));
        if (exchanged > 0) {
            neutrals_.add(normal_ev(ion), exchanged * first);
            bear(ion, exchanged, first, number);
        }
        if (scattered > 0) deflect(ion, scattered, first, number);
    }

    /// Place at which a second collision is looked at, between `y` and the wafer.
    static double second_place(double y, int number) {
        return y + (1 - y) * (0.001 + 0.998 * plastic(number, 1));
    }

    void bear(const SheathFall& parent, double weight, double first, int number) {
        SheathFall ion = parent;
        ion.restart({std::sqrt(field_.speed_squared(0.5 * thermal_ev_)), 0});
        double depth = ion.fall_to(second_place(parent.y(), number));
        const double rate = encounters_.rate_of(Kind::charge_exchange, normal_ev(ion));
        second_neutrals_.add(normal_ev(ion), weight * first * rate * (1 - parent.y()));
        depth += ion.fall_to(1);
        born_.add(normal_ev(ion), weight * std::exp(-depth));
    }

    void deflect(const SheathFall& parent, double weight, double first, int number) {
        SheathFall ion = parent;
        ion.restart(encounters_.deflected(parent.velocity(), plastic(number, 1),
                                          1 - 2 * plastic(number, 0)));
        double depth = ion.fall_to(second_place(parent.y(), number));
        const double slant =
            std::sqrt(ion.velocity().squared()) / std::max(1e-9, ion.velocity().along);
        const double rate = encounters_.rate_of(Kind::charge_exchange, ion.energy_ev());
        deflected_neutrals_.add(ion, weight * first * rate * slant * (1 - parent.y()));
        depth += ion.fall_to(1);
        deflected_.add(ion, weight * std::exp(-depth));
    }

    const SheathIon& ion_;
    SheathField field_;
    Encounters encounters_;
    double entry_ev_, thermal_ev_;
    int phases_, places_;
    double uncollided_ = 0, uncollided_ev_ = 0, free_ev_ = 0;
    Energies born_, neutrals_, second_neutrals_;
    Scattered deflected_, deflected_neutrals_;
};

} // namespace

FewCollisions few_collisions(const Sheath& sheath, const SheathIon& ion) {
    return Quadrature(sheath, ion).result();
}

} // namespace rille::fluxes
