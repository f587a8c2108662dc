// SPDX-License-Identifier: Apache-2.0
#include "engine/sheath_model.hpp"

#include "engine/content_cache.hpp"
#include "engine/packed_trajectories.hpp"
#include "fluxes/bias.hpp"
#include "fluxes/plasma_laws.hpp"
#include "fluxes/plasma_state.hpp"
#include "fluxes/sheath_arrival.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <stdexcept>

namespace rille::engine {

namespace {

using fluxes::IonDistribution;

/// Changes when trajectories do: what was kept before is then not found.
constexpr double trajectories_version = 1;
/// Child's law is off by this share of the field at the wafer at a voltage of ten electron
/// temperatures: below that its thickness is no more than a guess.
constexpr double weak_field_matters = 0.3;

fluxes::PlasmaState state_of(const Plasma& plasma, double electron_ev, double ion_flux) {
    fluxes::PlasmaMix mix;
    mix.electron_temperature_ev = electron_ev;
    for (const PlasmaIon& ion : plasma.ions)
        mix.ions.push_back({ion.name, ion.mass_amu, ion.share});
    mix.common_sound_speed = plasma.common_bohm_speed;
    mix.negative_ions = plasma.negative_over_electrons;
    if (plasma.negative_temperature_ev > 0)
        mix.negative_temperature_ratio = electron_ev / plasma.negative_temperature_ev;
    mix.edge_over_bulk = plasma.edge_to_bulk;
    return ion_flux > 0 ? fluxes::state_from_flux(mix, ion_flux)
                        : fluxes::state_from_bulk_density(mix, plasma.bulk_electron_density);
}

fluxes::Waveform sine(double frequency_hz) {
    return fluxes::Waveform::sum_of({{frequency_hz, 1.0, 0.0}});
}

/// Voltage across the sheath while the bias is on.
fluxes::WaferBias voltage_of(const Bias& bias, const fluxes::PlasmaState& state) {
    fluxes::BiasCircuit circuit;
    circuit.electron_temperature_ev = state.electron_temperature_ev;
    circuit.floating_drop_v = state.floating_drop_v;
    if (bias.area_ratio) circuit.wall_over_wafer_area = *bias.area_ratio;
    circuit.area_exponent = bias.area_exponent;
    switch (bias.given) {
    case Bias::Given::amplitude:
        return fluxes::bias_from_voltage(
            fluxes::Waveform::sum_of({{bias.frequency_hz, bias.value, 0.0}}), circuit);
    case Bias::Given::self_bias:
        return fluxes::bias_from_self_bias(sine(bias.frequency_hz), -bias.value, circuit);
    case Bias::Given::waveform:
        return fluxes::bias_from_voltage(bias.waveform, circuit);
    default:
        break;
    }
    // W per nm2 over the ions' current: 1 W = 1 / e eV per s.
    constexpr double elementary_charge_c = 1.602176634e-19; // SI definition of 2019, exact
    const double mean = bias.given == Bias::Given::power
                            ? bias.power_per_nm2 / (elementary_charge_c * state.ion_flux)
                            : bias.value;
    if (bias.frequency_hz > 0)
        return fluxes::bias_from_mean_sheath(sine(bias.frequency_hz), mean, circuit);
    fluxes::WaferBias steady;
    steady.sheath = fluxes::Waveform::steady(mean);
    steady.mean_sheath_v = mean;
    return steady;
}

/// The deepest part of a period may lie a little below zero by the electron balance, which holds
/// only for a positive sheath; real electrons then short it out.
fluxes::Waveform not_below_zero(fluxes::Waveform voltage) {
    for (double& volt : voltage.volt)
        volt = std::max(volt, 0.0);
    return voltage;
}

fluxes::SheathIon sheath_ion(const Plasma& plasma, std::size_t index,
                             const std::vector<fluxes::CollisionProcess>& collisions) {
    fluxes::SheathIon ion;
    ion.name = plasma.ions[index].name;
    ion.mass_amu = plasma.ions[index].mass_amu;
    ion.transverse_ev = plasma.ion_transverse_temperature_ev;
    ion.gas_temperature_k = plasma.gas_temperature_k;
    if (plasma.sheath_options.collisions) ion.collisions = collisions;
    return ion;
}

/// Trajectories take seconds, so what was followed before is looked up.
fluxes::BinnedTrajectories trajectories(const fluxes::Sheath& sheath, const fluxes::SheathIon& ion,
                                        const fluxes::TrajectorySampling& sampling) {
    static const ContentCache cache = ContentCache::of_user();
    std::vector<double> content = fluxes::content_of(sheath, ion, sampling);
    content.push_back(trajectories_version);
    if (const auto kept = cache.find(content))
        if (const auto binned = unpacked(*kept)) return *binned;
    fluxes::BinnedTrajectories binned = fluxes::follow_into_bins(sheath, ion, sampling);
    cache.keep(content, packed(binned));
    return binned;
}

fluxes::SheathArrival arrival_of(const fluxes::Sheath& sheath, const fluxes::SheathIon& ion,
                                 const fluxes::TrajectorySampling& sampling) {
    fluxes::check_range(sheath, ion);
    if (fluxes::way_through(sheath, ion) == fluxes::SheathWay::trajectories)
        return fluxes::arrival_of(trajectories(sheath, ion, sampling));
    return fluxes::arrive_in_closed_form(sheath, ion);
}

const char* name_of(fluxes::SheathWay way) {
    switch (way) {
    case fluxes::SheathWay::free_fall:
        return "free fall";
    case fluxes::SheathWay::closed_form:
        return "closed form";
    default:
        return "trajectories";
    }
}

/// Distributions of one kind of particle over the phases, weighted by what they bring.
struct Parts {
    std::vector<double> weight;
    std::vector<IonDistribution> part;

    void add(double flux, const IonDistribution& distribution) {
        if (!(flux > 0)) return;
        weight.push_back(flux);
        part.push_back(distribution);
    }
    double flux() const {
        double sum = 0;
        for (const double w : weight)
            sum += w;
        return sum;
    }
    IonDistribution whole() const {
        return part.size() == 1 ? part.front() : IonDistribution::mixture(weight, part);
    }
};

class Solver {
public:
    Solver(const Plasma& plasma,
           const std::vector<std::vector<fluxes::CollisionProcess>>& collisions, std::uint64_t seed)
        : plasma_(plasma), collisions_(collisions) {
        sampling_.ions = plasma.sheath_options.trajectories;
        sampling_.seed = seed;
    }

    SheathResult solve() {
        if (plasma_.bias.given != Bias::Given::nothing) add_phases();
        for (std::size_t i = 0; i < plasma_.ions.size(); ++i)
            result_.ions.push_back(ion_at_wafer(i));
        return std::move(result_);
    }

private:
    void add_phases() {
        const fluxes::PlasmaState on =
            state_of(plasma_, plasma_.electron_temperature_ev, plasma_.ion_flux);
        result_.plasma_potential_v = on.plasma_potential_v;
        const fluxes::WaferBias bias = voltage_of(plasma_.bias, on);
        if (-bias.sheath.lowest() > on.electron_temperature_ev)
            warn(fmt::format("the sheath voltage would fall to {:.3g} V; it is held at 0, where "
                             "electrons short it out",
                             bias.sheath.lowest()));
        const bool pulsed = plasma_.pulse.has_value();
        add_phase(pulsed ? "on" : "", pulsed ? plasma_.pulse->on : 1, on,
                  not_below_zero(bias.sheath));
        if (!pulsed || plasma_.pulse->on >= 1) return;
        const BiasPulse& pulse = *plasma_.pulse;
        if (pulse.off_ion_flux == 0) { // nothing arrives: the phase only thins the flux
            return;
        }
        const fluxes::PlasmaState off =
            state_of(plasma_, pulse.off_electron_temperature_ev,
                     pulse.off_ion_flux > 0 ? pulse.off_ion_flux : on.ion_flux);
        add_phase("off", 1 - pulse.on, off, fluxes::Waveform::steady(off.floating_drop_v));
    }

    void add_phase(const std::string& name, double share, const fluxes::PlasmaState& state,
                   const fluxes::Waveform& voltage) {
        SheathPhase phase;
        phase.name = name;
        phase.share = share;
        phase.debye_nm = state.debye_length_nm;
        phase.ion_flux = state.ion_flux;
        phase.floating_v = state.floating_drop_v;
        const fluxes::SheathAndThickness made =
            fluxes::make_sheath(state.electron_temperature_ev, state.edge_electrons, voltage,
                                mean_free_path_nm(voltage.mean()), plasma_.gas_temperature_k,
                                plasma_.sheath_options.edge);
        phase.sheath = made.sheath;
        phase.width_law = plasma_.sheath_options.edge == fluxes::SheathEdge::moving ? "matrix"
                          : made.thickness.law == fluxes::SheathLaw::collisional
                              ? "collisional Child law"
                              : "Child's law";
        for (const fluxes::SheathNote& note : made.thickness.notes) {
            const bool slight = note.kind == fluxes::SheathNote::Kind::weak_field &&
                                note.value < weak_field_matters;
            add(slight ? result_.notes : result_.warnings,
                (name.empty() ? "" : "bias " + name + ": ") + fluxes::in_words(note));
        }
        check_pulse(phase);
        result_.phases.push_back(std::move(phase));
    }

    /// Of the mixture of ions: rates of collision are averaged over the flux.
    double mean_free_path_nm(double energy_ev) const {
        double per_nm = 0;
        for (std::size_t i = 0; i < plasma_.ions.size(); ++i)
            per_nm += plasma_.ions[i].share /
                      fluxes::mean_free_path_nm(sheath_ion(plasma_, i, processes(i)), energy_ev);
        return 1 / per_nm;
    }

    /// A slow pulse is a sum of two steady states only if ions cross the sheath much faster.
    void check_pulse(const SheathPhase& phase) {
        if (!plasma_.pulse) return;
        double slowest = 0;
        for (const PlasmaIon& ion : plasma_.ions)
            slowest = std::max(slowest, fluxes::transit_time_s(phase.sheath, ion.mass_amu));
        if (phase.share / plasma_.pulse->frequency_hz < 10 * slowest)
            warn(fmt::format("bias {}: lasts less than ten transits of the slowest ion; the pulse "
                             "is not slow, give it as a waveform",
                             phase.name));
    }

    IonAtWafer ion_at_wafer(std::size_t i) {
        const PlasmaIon& ion = plasma_.ions[i];
        IonAtWafer at_wafer;
        at_wafer.name = ion.name;
        at_wafer.mass_amu = ion.mass_amu;
        Parts ions, fast;
        if (result_.phases.empty()) ions.add(flux_by_table() * ion.share, table_of(ion.name));
        for (const SheathPhase& phase : result_.phases) {
            const fluxes::SheathIon moving = sheath_ion(plasma_, i, processes(i));
            const fluxes::SheathArrival arrival = arrival_of(phase.sheath, moving, sampling_);
            const double flux = phase.share * phase.ion_flux * ion.share;
            ions.add(flux, arrival.ions.front());
            for (const IonDistribution& part : arrival.fast_neutrals)
                fast.add(flux * arrival.fast_neutrals_per_ion, part);
            if (!at_wafer.way.empty()) continue;
            at_wafer.way = name_of(arrival.way);
            at_wafer.transit_s = fluxes::transit_time_s(phase.sheath, ion.mass_amu);
            at_wafer.collisionality = fluxes::collisionality(phase.sheath, moving);
        }
        if (result_.phases.empty()) at_wafer.way = "table";
        fill(at_wafer, ions, fast);
        return at_wafer;
    }

    void fill(IonAtWafer& at_wafer, const Parts& ions, const Parts& fast) const {
        const auto leaning = [&](const IonDistribution& d) {
            return plasma_.ion_tilt_deg > 0
                       ? d.tilted(plasma_.ion_tilt_deg, plasma_.ion_azimuth_deg)
                       : d;
        };
        at_wafer.flux = ions.flux();
        at_wafer.fast_neutral_flux = fast.flux();
        // An ion without flux still needs a distribution: one that nothing follows.
        at_wafer.ions.push_back(ions.part.empty() ? IonDistribution::beam(1, {0, 0, -1})
                                                  : leaning(ions.whole()));
        if (!fast.part.empty()) at_wafer.fast_neutrals.push_back(leaning(fast.whole()));
        Parts both;
        both.add(ions.flux(), at_wafer.ions.front());
        if (!fast.part.empty()) both.add(fast.flux(), at_wafer.fast_neutrals.front());
        at_wafer.arriving.push_back(both.part.empty() ? at_wafer.ions.front() : both.whole());
    }

    double flux_by_table() const {
        if (plasma_.ion_flux > 0 || !(plasma_.bulk_electron_density > 0)) return plasma_.ion_flux;
        return state_of(plasma_, plasma_.electron_temperature_ev, 0).ion_flux;
    }

    const IonDistribution& table_of(const std::string& ion) const {
        const auto own = plasma_.ion_energies.find(ion);
        const auto found = own != plasma_.ion_energies.end() ? own : plasma_.ion_energies.find("");
        if (found == plasma_.ion_energies.end())
            throw std::domain_error("nothing says how fast the ions are");
        return found->second;
    }

    const std::vector<fluxes::CollisionProcess>& processes(std::size_t i) const {
        static const std::vector<fluxes::CollisionProcess> none;
        return i < collisions_.size() ? collisions_[i] : none;
    }

    static void add(std::vector<std::string>& list, const std::string& text) {
        if (std::find(list.begin(), list.end(), text) == list.end()) list.push_back(text);
    }
    void warn(const std::string& text) { add(result_.warnings, text); }

    const Plasma& plasma_;
    const std::vector<std::vector<fluxes::CollisionProcess>>& collisions_;
    fluxes::TrajectorySampling sampling_;
    SheathResult result_;
};

} // namespace

SheathResult solve_sheath(const Plasma& plasma,
                          const std::vector<std::vector<fluxes::CollisionProcess>>& collisions,
                          std::uint64_t seed) {
    const bool has_ions =
        !plasma.ions.empty() && (plasma.ion_flux > 0 || plasma.bulk_electron_density > 0);
    if (!has_ions) return {};
    return Solver(plasma, collisions, seed).solve();
}

} // namespace rille::engine
