// SPDX-License-Identifier: Apache-2.0
#include "engine/case_build.hpp"

#include "engine/ion_table_file.hpp"
#include "engine/words.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <filesystem>

namespace rille::engine {

namespace {

void build_ions(const Entry& entry, Plasma& plasma, Problems& problems) {
    const Entry& ions = entry["ions"];
    double sum = 0;
    bool all_good = ions.is_good;
    for (const auto& [name, share] : ions.members) {
        all_good = all_good && share.is_good;
        sum += share.number;
        plasma.ions.push_back({name, 0, share.number});
    }
    if (!all_good) return;
    // Shares are written with few digits; thirds of 100 % are as good as a third.
    if (std::abs(sum - 1) > 2e-3)
        problems.add(ions.at, ions.path,
                     fmt::format("the shares add up to {:.6g} %; 100 % is due", 100 * sum));
    else
        for (PlasmaIon& ion : plasma.ions)
            ion.share /= sum;
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
void add_table(const Entry& entry, const Entry& parent, const std::string& ion, Case& result,
               Plasma& plasma, Problems& problems) {
    const Entry& file = entry["file"];
    if (!file.is_good) return;
    const std::string shown = std::filesystem::path(file.text).filename().string();
    if (!std::filesystem::is_regular_file(file.text)) {
        problems.add(file.at, file.path, fmt::format("no such file: {}", file.text));
        return;
    }
    const std::optional<IonTable> table = read_ion_table(file.text, shown, problems);
    if (!table) return;
    check_table(*table, ion, file, problems);
    const Entry& own = entry["transverse_temperature"];
    const double transverse =
        own.is_good ? own.number : parent["ion_transverse_temperature"].number;
    if (own.is_good && !table->angle_edges_deg.empty())
        problems.add(own.at, own.path, "the table holds angles; leave this out");
    for (const std::string& warning : table->warnings)
        result.warnings.push_back(warning);
    plasma.ion_energies.emplace(ion, distribution_of(*table, transverse));
}

void build_energies(const Entry& entry, Case& result, Plasma& plasma, Problems& problems) {
    const Entry& energies = entry["ion_energies"];
    const Entry& bias = entry["rf_bias"];
    plasma.mean_sheath_voltage = bias["mean_sheath"].number;
    if (energies.is_given && bias.is_given) {
        problems.add(energies.at, energies.path,
                     "rf_bias and ion_energies both say how fast ions are; give one");
        return;
    }
    const bool has_ions = !plasma.ions.empty() && plasma.ion_flux > 0;
    if (!energies.is_given && !bias.is_given && has_ions)
        problems.add(entry.at, entry.path,
                     "nothing says how fast the ions are; give rf_bias: {mean_sheath: 120 V}, or "
                     "ion_energies");
    if (!energies.is_given || !energies.is_good) return;
    if (energies["file"].is_given) {
        add_table(energies, entry, "", result, plasma, problems);
        return;
    }
    for (const auto& [ion, table] : energies.members) {
        const bool known = std::any_of(plasma.ions.begin(), plasma.ions.end(),
                                       [&, name = ion](const auto& i) { return i.name == name; });
        if (known)
            add_table(table, entry, ion, result, plasma, problems);
        else
            problems.add(table.at, table.path, "the plasma has no such ion");
    }
    for (const PlasmaIon& ion : plasma.ions)
        if (energies["file"].is_given == false && !energies[ion.name].is_given)
            problems.add(energies.at, energies.path, fmt::format("no table for {}", ion.name));
}

void list_unused(const Entry& entry, Plasma& plasma) {
    for (const char* key : {"pressure", "source_power", "source_frequency", "gas_temperature"})
        if (entry[key].is_given) plasma.unused.push_back(std::string(key) + ": " + entry[key].text);
    for (const auto& [gas, flow] : entry["flows"].members)
        plasma.unused.push_back("flows." + gas + ": " + flow.text);
}

} // namespace

void build_plasmas(const Entry& root, Case& result, Problems& problems) {
    const Entry& plasmas = root["plasmas"];
    if (plasmas.is_good && plasmas.members.empty())
        problems.add(plasmas.at, plasmas.path, "at least one plasma is due");
    for (const auto& [name, entry] : plasmas.members) {
        Plasma plasma;
        plasma.name = name;
        plasma.electron_temperature_ev = entry["electron_temperature"].number;
        plasma.ion_flux = entry["ion_flux"].number;
        plasma.ion_transverse_temperature_ev = entry["ion_transverse_temperature"].number;
        for (const auto& [species, neutral] : entry["neutrals"].members)
            plasma.neutrals.push_back(
                {species, neutral["flux"].number, neutral["temperature"].number});
        build_ions(entry, plasma, problems);
        if (entry.is_good && entry["ion_flux"].is_good && plasma.ion_flux > 0 &&
            plasma.ions.empty() && !entry["ions"].is_given)
            problems.add(entry["ion_flux"].at, entry.path,
                         "an ion flux needs ions, for example ions: {Ar+: 100 %}");
        if (entry.is_good) build_energies(entry, result, plasma, problems);
        list_unused(entry, plasma);
        result.plasmas.emplace(name, std::move(plasma));
    }
}

} // namespace rille::engine
