// SPDX-License-Identifier: Apache-2.0
#include "engine/case_build.hpp"

#include "engine/ion_table_file.hpp"
#include "engine/retarding_curve_file.hpp"
#include "engine/waveform_file.hpp"
#include "engine/words.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <filesystem>

namespace rille::engine {

namespace {

/// The file that an entry names, and the name to show for it; a problem if there is none.
bool is_there(const Entry& file, Problems& problems) {
    if (!file.is_good) return false;
    if (std::filesystem::is_regular_file(file.text)) return true;
    problems.add(file.at, file.path, fmt::format("no such file: {}", file.text));
    return false;
}
std::string shown(const Entry& file) {
    return std::filesystem::path(file.text).filename().string();
}

void check_table(const IonTable& table, const std::string& ion, const Entry& file,
                 Problems& problems) {
    const auto species = table.header.find("species");
    const bool named = species != table.header.end() && !species->second.empty();
    if (named && !ion.empty() && species->second != ion)
        problems.add(file.at, file.path,
                     fmt::format("the table is of {}, not of {}", species->second, ion));
}

/// One table; `ion` is empty if it holds for all ions.
void add_table(const Entry& entry, const std::string& ion, Case& result, Plasma& plasma,
               Problems& problems) {
    const Entry& file = entry["file"];
    if (!is_there(file, problems)) return;
    const std::optional<IonTable> table = read_ion_table(file.text, shown(file), problems);
    if (!table) return;
    check_table(*table, ion, file, problems);
    const Entry& own = entry["transverse_temperature"];
    const double transverse = own.is_good ? own.number : plasma.ion_transverse_temperature_ev;
    if (own.is_good && !table->angle_edges_deg.empty())
        problems.add(own.at, own.path, "the table holds angles; leave this out");
    for (const std::string& warning : table->warnings)
        result.warnings.push_back(warning);
    plasma.ion_energies.emplace(ion, distribution_of(*table, transverse));
}

void add_curve(const Entry& entry, const std::string& ion, Case& result, Plasma& plasma,
               Problems& problems) {
    const Entry& file = entry["retarding_curve"];
    const Entry& potential = entry["wafer_potential"];
    const bool from_ground = entry["referenced_to"].text == "ground";
    if (from_ground && !potential.is_given)
        problems.add(entry.at, entry.path,
                     "voltages referenced to ground need wafer_potential: how far the wafer's mean "
                     "lies from ground");
    if (!from_ground && potential.is_given)
        problems.add(potential.at, potential.path,
                     "voltages are referenced to the wafer; leave this out");
    if (!is_there(file, problems) || !entry["smoothing"].is_good) return;
    const auto spectrum = read_retarding_curve(file.text, shown(file), entry["smoothing"].number,
                                               from_ground ? -potential.number : 0, problems);
    if (!spectrum) return;
    for (const std::string& warning : spectrum->warnings)
        result.warnings.push_back(warning);
    plasma.ion_energies.emplace(
        ion, fluxes::IonDistribution::falling_spectrum(spectrum->energy_edges_ev, spectrum->share,
                                                       entry["transverse_temperature"].number));
}

void add_energies(const Entry& entry, const std::string& ion, Case& result, Plasma& plasma,
                  Problems& problems) {
    if (!entry.is_good) return;
    if (entry["retarding_curve"].is_given)
        add_curve(entry, ion, result, plasma, problems);
    else
        add_table(entry, ion, result, plasma, problems);
}

void build_energies(const Entry& energies, Case& result, Plasma& plasma, Problems& problems) {
    if (!energies.is_good) return;
    if (energies["file"].is_given || energies["retarding_curve"].is_given) {
        add_energies(energies, "", result, plasma, problems);
        return;
    }
    for (const auto& [ion, table] : energies.members) {
        const bool known = std::any_of(plasma.ions.begin(), plasma.ions.end(),
                                       [&, name = ion](const auto& i) { return i.name == name; });
        if (known)
            add_energies(table, ion, result, plasma, problems);
        else
            problems.add(table.at, table.path, "the plasma has no such ion");
    }
    for (const PlasmaIon& ion : plasma.ions)
        if (!energies[ion.name].is_given)
            problems.add(energies.at, energies.path, fmt::format("no table for {}", ion.name));
}

/// The one key that says how strong the bias is; nullptr and a problem if none or several are.
const Entry* strength_of(const Entry& bias, Problems& problems) {
    static const std::vector<std::string> ways = {"amplitude",   "peak_to_peak", "self_bias",
                                                  "mean_sheath", "power",        "components",
                                                  "waveform",    "rectangular"};
    const Entry* strength = nullptr;
    for (const std::string& way : ways) {
        const Entry& entry = bias[way];
        if (!entry.is_given) continue;
        if (strength) {
            problems.add(entry.at, entry.path,
                         fmt::format("{} says how strong the bias is already; give one",
                                     strength->rule->key));
            return nullptr;
        }
        strength = &entry;
    }
    if (!strength && !bias.has_refused)
        problems.add(
            bias.at, bias.path,
            fmt::format("nothing says how strong the bias is; give one of {}", listed(ways)));
    return strength && strength->is_good ? strength : nullptr;
}

/// Frequency: due with a sine and two levels, stated by the others themselves.
void build_frequency(const Entry& bias, const Entry& strength, Plasma& plasma, Problems& problems) {
    const Entry& frequency = bias["frequency"];
    const std::string& way = strength.rule->key;
    plasma.bias.frequency_hz = frequency.number;
    const bool own = way == "components" || way == "waveform";
    if (own && frequency.is_given)
        problems.add(
            frequency.at, frequency.path,
            fmt::format("{} hold the frequency already; leave this out",
                        way == "waveform" ? "the times of the waveform" : "the components"));
    if (!own && way != "mean_sheath" && !frequency.is_given)
        problems.add(bias.at, bias.path,
                     fmt::format("{} needs the frequency, for example 13.56 MHz", way));
}

void build_power(const Entry& bias, Plasma& plasma, Problems& problems) {
    const Entry &area = bias["electrode_area"], &delivered = bias["delivered"];
    const bool is_power = bias["power"].is_given;
    for (const Entry* entry : {&area, &delivered})
        if (entry->is_given && !is_power)
            problems.add(entry->at, entry->path, "belongs to power, which is not given");
    if (is_power && (!area.is_given || !delivered.is_given))
        problems.add(bias.at, bias.path,
                     "power needs electrode_area, and delivered: the share that accelerates ions");
    if (is_power && area.is_good && delivered.is_good)
        plasma.bias.power_per_nm2 = bias["power"].number * delivered.number / area.number;
}

fluxes::Waveform waveform_of(const Entry& bias, Problems& problems) {
    if (const Entry& file = bias["waveform"]; file.is_given) {
        if (!is_there(file, problems)) return {};
        return read_waveform(file.text, shown(file), problems).value_or(fluxes::Waveform());
    }
    if (const Entry& levels = bias["rectangular"]; levels.is_given) {
        const double high = levels["high"].number, low = levels["low"].number;
        if (!(high > low)) problems.add(levels.at, levels.path, "high must lie above low");
        if (!(high > low) || !(bias["frequency"].number > 0)) return {};
        return fluxes::Waveform::rectangular(bias["frequency"].number, high, low,
                                             levels["high_for"].number);
    }
    std::vector<fluxes::BiasComponent> parts;
    for (const Entry& part : bias["components"].items)
        parts.push_back({part["frequency"].number, part["amplitude"].number,
                         part["phase"].number * 3.14159265358979323846 / 180});
    try {
        return fluxes::Waveform::sum_of(parts);
    } catch (const std::invalid_argument& error) {
        problems.add(bias["components"].at, bias["components"].path, error.what());
        return {};
    }
}

void build_strength(const Entry& bias, const Entry& strength, Plasma& plasma, Problems& problems) {
    using Given = Bias::Given;
    Bias& result = plasma.bias;
    const std::string& way = strength.rule->key;
    result.value = strength.number;
    if (way == "amplitude") result.given = Given::amplitude;
    if (way == "peak_to_peak") {
        result.given = Given::amplitude;
        result.value = 0.5 * strength.number;
    }
    if (way == "self_bias") result.given = Given::self_bias;
    if (way == "mean_sheath") result.given = Given::mean_sheath;
    if (way == "power") result.given = Given::power;
    if (way == "components" || way == "waveform" || way == "rectangular") {
        result.given = Given::waveform;
        const std::size_t before = problems.size();
        result.waveform = waveform_of(bias, problems);
        if (problems.size() == before && result.waveform.volt.empty())
            result.given = Given::nothing; // a missing key, reported already
    }
    if (bias["area_ratio"].is_good) result.area_ratio = bias["area_ratio"].number;
    result.area_exponent = bias["area_exponent"].number;
}

void build_pulse(const Entry& entry, Plasma& plasma, Problems& problems) {
    const Entry& pulse = entry["pulse"];
    if (!pulse.is_given || !pulse.is_good) return;
    if (!entry["rf_bias"].is_given) {
        problems.add(pulse.at, pulse.path, "pulse switches rf_bias, which is not given");
        return;
    }
    const Entry& off = pulse["off"];
    BiasPulse result;
    result.frequency_hz = pulse["frequency"].number;
    result.on = pulse["on"].number;
    result.off_ion_flux = off["ion_flux"].is_given ? off["ion_flux"].number : -1;
    result.off_electron_temperature_ev = off["electron_temperature"].is_given
                                             ? off["electron_temperature"].number
                                             : plasma.electron_temperature_ev;
    plasma.pulse = result;
}

} // namespace

void build_bias(const Entry& entry, Case& result, Plasma& plasma, Problems& problems) {
    const Entry& energies = entry["ion_energies"];
    const Entry& bias = entry["rf_bias"];
    if (energies.is_given && bias.is_given) {
        problems.add(energies.at, energies.path,
                     "rf_bias and ion_energies both say how fast ions are; give one");
        return;
    }
    const bool has_ions =
        !plasma.ions.empty() && (plasma.ion_flux > 0 || plasma.bulk_electron_density > 0);
    if (!energies.is_given && !bias.is_given && has_ions)
        problems.add(entry.at, entry.path,
                     "nothing says how fast the ions are; give rf_bias, for example {frequency: "
                     "13.56 MHz, amplitude: 120 V}, or ion_energies");
    if (energies.is_given) build_energies(energies, result, plasma, problems);
    if (bias.is_given && bias.is_good) {
        build_power(bias, plasma, problems);
        if (const Entry* strength = strength_of(bias, problems)) {
            build_frequency(bias, *strength, plasma, problems);
            build_strength(bias, *strength, plasma, problems);
        }
    }
    build_pulse(entry, plasma, problems);
}

} // namespace rille::engine
