// SPDX-License-Identifier: Apache-2.0
#include "engine/sheath_output.hpp"

#include "engine/case.hpp"
#include "engine/number_text.hpp"
#include "engine/output_names.hpp"
#include "engine/picture.hpp"
#include "engine/sheath_figures.hpp"
#include "engine/units.hpp"

#include <fmt/format.h>
#include <nlohmann/json.hpp>

namespace rille::engine {

namespace {

constexpr int table_energy_bins = 64, table_angle_bins = 32;

/// One kind of particle that arrives.
struct Kind {
    const Plasma& plasma;
    const IonAtWafer& ion;
    std::string species; ///< "Ar+", "fast Ar"
    double flux = 0;     ///< [nm^-2 s^-1]
    const fluxes::IonDistribution& distribution;
    bool is_ion = true;
};

std::vector<Kind> kinds_of(const Plasma& plasma) {
    std::vector<Kind> kinds;
    if (!plasma.arrivals) return kinds;
    for (const IonAtWafer& ion : plasma.arrivals->ions) {
        kinds.push_back({plasma, ion, ion.name, ion.flux, ion.ions.front(), true});
        const std::string neutral = ion.name.substr(0, ion.name.find_last_not_of('+') + 1);
        for (const auto& fast : ion.fast_neutrals)
            kinds.push_back({plasma, ion, "fast " + neutral, ion.fast_neutral_flux, fast, false});
    }
    return kinds;
}

double in_ma_per_cm2(double flux) {
    return flux / units_of(Dimension::ion_flux).front().factor;
}

/// Period of the bias over the ion's transit; 0 for a steady sheath.
double transit_over_period(const Plasma& plasma, const IonAtWafer& ion) {
    const auto& phases = plasma.arrivals->phases;
    const double period = phases.empty() ? 0 : phases.front().sheath.voltage.period_s;
    return period > 0 ? ion.transit_s / period : 0;
}

std::string phase_line(const SheathPhase& phase) {
    const fluxes::Sheath& s = phase.sheath;
    const fluxes::Waveform& v = s.voltage;
    std::string text = phase.name.empty()
                           ? std::string("  sheath: ")
                           : fmt::format("  sheath, bias {} ({:.3g} % of the time): ", phase.name,
                                         100 * phase.share);
    text += fmt::format("{:.4g} nm = {:.3g} Debye lengths thick ({})", s.thickness_nm,
                        s.thickness_nm / phase.debye_nm, phase.width_law);
    if (v.is_steady()) return text + fmt::format(", steady {:.4g} V\n", v.mean());
    return text + fmt::format(", {:.4g} to {:.4g} V, mean {:.4g} V, period {:.4g} us\n", v.lowest(),
                              v.highest(), v.mean(), 1e6 * v.period_s);
}

std::string kind_line(const Kind& kind) {
    const DistributionFigures f = figures_of(kind.distribution);
    const double ratio = transit_over_period(kind.plasma, kind.ion);
    return fmt::format(
        "  {:<9}{:>12}{:>12}{:>10}{:>9.1f}{:>9.1f}{:>9.1f}{:>9.2f}{:>9.2f}  {}\n", kind.species,
        kind.is_ion ? fmt::format("{:.4g}", in_ma_per_cm2(kind.flux)) : "",
        fmt::format("{:.3g}", kind.flux * 1e14), ratio > 0 ? fmt::format("{:.3g}", ratio) : "-",
        f.mean_ev, f.low_ev, f.high_ev, f.median_deg, f.fwhm_deg, kind.ion.way);
}

std::string plasma_table(const Plasma& plasma) {
    std::string text = "plasma " + plasma.name + "\n";
    if (!plasma.arrivals || plasma.arrivals->ions.empty()) return text + "  no ions\n";
    for (const SheathPhase& phase : plasma.arrivals->phases)
        text += phase_line(phase);
    if (plasma.arrivals->plasma_potential_v > 0)
        text += fmt::format("  plasma potential over a floating wall: {:.3g} V\n",
                            plasma.arrivals->plasma_potential_v);
    text += fmt::format("  {:<9}{:>12}{:>12}{:>10}{:>9}{:>9}{:>9}{:>9}{:>9}  {}\n", "particle",
                        "mA/cm2", "/cm2/s", "transit", "mean", "5 %", "95 %", "median", "FWHM",
                        "found by");
    text += fmt::format("  {:<9}{:>12}{:>12}{:>10}{:>9}{:>9}{:>9}{:>9}{:>9}\n", "", "", "",
                        "/period", "eV", "eV", "eV", "deg", "deg");
    for (const Kind& kind : kinds_of(plasma))
        text += kind_line(kind);
    for (const PlasmaNeutral& neutral : plasma.neutrals)
        text += fmt::format("  {:<9}{:>12}{:>12.3g}  thermal at {:.4g} K\n", neutral.name, "",
                            neutral.flux * 1e14, neutral.temperature_k);
    for (const std::string& warning : plasma.arrivals->warnings)
        text += "  warning: " + warning + "\n";
    for (const std::string& note : plasma.arrivals->notes)
        text += "  note: " + note + "\n";
    if (!plasma.unused.empty()) {
        text += "  not used by the model:";
        for (const std::string& set_point : plasma.unused)
            text += " " + set_point + ";";
        text.back() = '\n';
    }
    return text;
}

nlohmann::json phase_json(const SheathPhase& phase) {
    const fluxes::Sheath& s = phase.sheath;
    return {{"name", phase.name},
            {"share_of_time", phase.share},
            {"thickness_nm", s.thickness_nm},
            {"debye_length_nm", phase.debye_nm},
            {"width_law", phase.width_law},
            {"mean_V", s.voltage.mean()},
            {"lowest_V", s.voltage.lowest()},
            {"highest_V", s.voltage.highest()},
            {"period_s", s.voltage.period_s},
            {"electron_temperature_eV", s.electron_temperature_ev},
            {"edge_density_per_nm3", s.edge_density},
            {"floating_fall_V", phase.floating_v},
            {"ion_flux_per_nm2_s", phase.ion_flux}};
}

nlohmann::json kind_json(const Kind& kind) {
    const DistributionFigures f = figures_of(kind.distribution);
    return {{"particle", kind.species},
            {"flux_per_nm2_s", kind.flux},
            {"found_by", kind.ion.way},
            {"transit_over_period", transit_over_period(kind.plasma, kind.ion)},
            {"thickness_over_mean_free_path", kind.ion.collisionality},
            {"mean_energy_eV", f.mean_ev},
            {"energy_5_percent_eV", f.low_ev},
            {"energy_95_percent_eV", f.high_ev},
            {"median_angle_deg", f.median_deg},
            {"angle_fwhm_deg", f.fwhm_deg}};
}

} // namespace

std::string sheath_table(const Case& c) {
    std::string text;
    for (const auto& [name, plasma] : c.plasmas)
        text += (text.empty() ? "" : "\n") + plasma_table(plasma);
    return text + "\nEnergies: below 5 % and 95 % of the flux; angles from the wafer normal. "
                  "Voltages are those of a model, not permitted settings of a tool.\n";
}

nlohmann::json sheath_json(const Case& c) {
    nlohmann::json plasmas = nlohmann::json::array();
    for (const auto& [name, plasma] : c.plasmas) {
        nlohmann::json json = {{"name", name},
                               {"phases", nlohmann::json::array()},
                               {"particles", nlohmann::json::array()},
                               {"neutrals", nlohmann::json::array()},
                               {"not_used", plasma.unused}};
        if (plasma.arrivals) {
            for (const SheathPhase& phase : plasma.arrivals->phases)
                json["phases"].push_back(phase_json(phase));
            json["plasma_potential_V"] = plasma.arrivals->plasma_potential_v;
            json["warnings"] = plasma.arrivals->warnings;
        }
        for (const Kind& kind : kinds_of(plasma))
            json["particles"].push_back(kind_json(kind));
        for (const PlasmaNeutral& neutral : plasma.neutrals)
            json["neutrals"].push_back({{"particle", neutral.name},
                                        {"flux_per_nm2_s", neutral.flux},
                                        {"temperature_K", neutral.temperature_k}});
        plasmas.push_back(json);
    }
    return {{"title", c.title}, {"plasmas", plasmas}};
}

std::string sheath_csv(const Case& c) {
    std::string text = "plasma,particle,flux_per_nm2_s,mean_energy_eV,energy_5_percent_eV,"
                       "energy_95_percent_eV,median_angle_deg,angle_fwhm_deg,transit_over_period,"
                       "thickness_over_mean_free_path,found_by\n";
    for (const auto& [name, plasma] : c.plasmas)
        for (const Kind& kind : kinds_of(plasma)) {
            const DistributionFigures f = figures_of(kind.distribution);
            text += csv_field(name) + "," + csv_field(kind.species);
            for (const double value :
                 {kind.flux, f.mean_ev, f.low_ev, f.high_ev, f.median_deg, f.fwhm_deg,
                  transit_over_period(plasma, kind.ion), kind.ion.collisionality})
                text += "," + shortest(value);
            text += "," + kind.ion.way + "\n";
        }
    return text;
}

std::string distribution_csv(const std::string& species, double mass_amu, double flux_per_nm2_s,
                             const fluxes::IonDistribution& distribution,
                             const std::string& source) {
    const JointSpectrum joint = joint_spectrum(distribution, table_energy_bins, table_angle_bins);
    std::string text =
        fmt::format("# species={}\n# mass_amu={}\n# charge=1\n# quantity=per_bin\n"
                    "# energy_reference=wafer\n# angle_convention=polar\n"
                    "# total_flux_m2s={}\n# source={}\n",
                    species, shortest(mass_amu), shortest(flux_per_nm2_s * 1e18), source);
    text += "energy_eV by angle_deg";
    for (const double edge : joint.angle_edges_deg)
        text += "," + shortest(edge);
    for (std::size_t e = 0; e < joint.share.size(); ++e) {
        text += "\n" + shortest(joint.energy_edges_ev[e]);
        for (const double share : joint.share[e])
            text += "," + shortest(share);
    }
    return text + "\n" + shortest(joint.energy_edges_ev.back()) + "\n";
}

void write_sheath(OutputFolder& folder, const Case& c, bool tables) {
    const std::string picture = sheath_picture_svg(c);
    folder.write(output_names::sheath_svg, picture);
    folder.write(output_names::sheath_png, png_of(picture, 2));
    if (!tables) return;
    folder.write(output_names::sheath_csv, sheath_csv(c));
    for (const auto& [name, plasma] : c.plasmas)
        for (const Kind& kind : kinds_of(plasma))
            folder.write(fmt::format("{}/{}_{}.csv", output_names::sheath_tables, column_name(name),
                                     column_name(kind.species)),
                         distribution_csv(kind.species, kind.ion.mass_amu, kind.flux,
                                          kind.distribution, "rille sheath, " + kind.ion.way));
}

} // namespace rille::engine
