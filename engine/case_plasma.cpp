// SPDX-License-Identifier: Apache-2.0
#include "engine/case_build.hpp"

#include "engine/words.hpp"
#include "fluxes/plasma_laws.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

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

/// Electrons and ions: exactly one of flux and density says how many there are.
void build_charges(const Entry& entry, Plasma& plasma, Problems& problems) {
    const Entry &flux = entry["ion_flux"], &density = entry["electron_density"];
    plasma.electron_temperature_ev = entry["electron_temperature"].number;
    plasma.ion_flux = flux.number;
    plasma.bulk_electron_density = density.number;
    plasma.edge_to_bulk = entry["edge_to_bulk"].number;
    plasma.negative_over_electrons = entry["negative_ions"]["edge_ratio"].number;
    plasma.negative_temperature_ev = entry["negative_ions"]["temperature"].number;
    plasma.common_bohm_speed = entry["bohm_speed"].text == "common";
    plasma.ion_transverse_temperature_ev = entry["ion_transverse_temperature"].number;
    plasma.ion_tilt_deg = entry["ion_tilt"]["angle"].number;
    plasma.ion_azimuth_deg = entry["ion_tilt"]["azimuth"].number;
    if (flux.is_given && density.is_given)
        problems.add(density.at, density.path,
                     "ion_flux and electron_density both say how many ions there are; give one");
    if (!flux.is_given && !density.is_given && !entry["ions"].members.empty())
        problems.add(entry.at, entry.path,
                     "nothing says how many ions there are; give ion_flux, for example 1.1 mA/cm2, "
                     "or electron_density");
    build_ions(entry, plasma, problems);
    const Entry& given = flux.is_given ? flux : density;
    if (given.is_good && given.number > 0 && plasma.ions.empty() && !entry["ions"].is_given)
        problems.add(given.at, entry.path,
                     fmt::format("{} needs ions, for example ions: {{Ar+: 100 %}}",
                                 flux.is_given ? "an ion flux" : "an electron density"));
}

void build_sheath_options(const Entry& entry, Plasma& plasma) {
    const Entry& sheath = entry["sheath"];
    plasma.sheath_options.edge =
        sheath["edge"].text == "moving" ? fluxes::SheathEdge::moving : fluxes::SheathEdge::fixed;
    plasma.sheath_options.collisions = sheath["collisions"].text != "ignored";
    plasma.sheath_options.trajectories = static_cast<int>(sheath["trajectories"].number);
    plasma.cross_sections = sheath["cross_sections"].text;
}

/// Shares of the gas by particles after the dissociation, from the flows; empty without flows.
std::vector<std::pair<std::string, double>> gas_shares(const Entry& entry, Problems& problems) {
    std::vector<std::pair<std::string, double>> shares;
    const auto add = [&](const std::string& name, double amount) {
        for (auto& [known, share] : shares)
            if (known == name) {
                share += amount;
                return;
            }
        shares.emplace_back(name, amount);
    };
    const Entry &flows = entry["flows"], &dissociation = entry["dissociation"];
    for (const auto& [gas, flow] : flows.members) {
        const Entry& split = dissociation[gas];
        add(gas, flow.number * (1 - split["fraction"].number));
        for (const auto& [piece, count] : split["into"].members)
            add(piece, flow.number * split["fraction"].number * count.number);
    }
    for (const auto& [gas, split] : dissociation.members)
        if (!flows[gas].is_given)
            problems.add(split.at, split.path, "this gas does not flow; name it under flows");
    double sum = 0;
    for (const auto& share : shares)
        sum += share.second;
    if (flows.is_given && flows.is_good && !(sum > 0))
        problems.add(flows.at, flows.path, "no gas flows at all");
    for (auto& share : shares)
        share.second /= sum > 0 ? sum : 1;
    return shares;
}

void build_gas(const Entry& entry, Plasma& plasma, Problems& problems) {
    plasma.gas_temperature_k = entry["gas_temperature"].number;
    const Entry& pressure = entry["pressure"];
    if (pressure.is_good) plasma.pressure_pa = pressure.number;
    for (const auto& [gas, share] : gas_shares(entry, problems))
        if (share > 0 && pressure.is_good && plasma.gas_temperature_k > 0)
            plasma.gases.push_back(
                {gas, share * fluxes::gas_density(pressure.number, plasma.gas_temperature_k)});
}

/// Density of one neutral [nm^-3], from its own pressure or from the gas; flux 0 until its mass is
/// known.
void build_neutral(const Entry& entry, const std::string& name, Plasma& plasma,
                   Problems& problems) {
    PlasmaNeutral neutral;
    neutral.name = name;
    const Entry& own = entry["temperature"];
    neutral.temperature_k = own.is_given ? own.number : plasma.gas_temperature_k;
    const Entry &flux = entry["flux"], &partial = entry["partial_pressure"];
    if (flux.is_given && partial.is_given)
        problems.add(partial.at, partial.path,
                     "flux and partial_pressure are both given; give one");
    neutral.flux = flux.number;
    if (partial.is_good && neutral.temperature_k > 0) // a bad temperature is reported already
        neutral.density = fluxes::gas_density(partial.number, neutral.temperature_k);
    if (!flux.is_given && !partial.is_given) {
        const auto gas = std::find_if(plasma.gases.begin(), plasma.gases.end(),
                                      [&](const PlasmaGas& g) { return g.name == name; });
        if (gas != plasma.gases.end())
            neutral.density = gas->density * plasma.gas_temperature_k / neutral.temperature_k;
        else
            problems.add(entry.at, entry.path,
                         "nothing says how much of it there is; give flux or partial_pressure, or "
                         "pressure and flows (and dissociation) from which it comes");
    }
    plasma.neutrals.push_back(neutral);
}

void list_unused(const Entry& entry, Plasma& plasma) {
    std::vector<const char*> unused = {"source_power", "source_frequency"};
    const bool by_gas = std::any_of(plasma.neutrals.begin(), plasma.neutrals.end(),
                                    [](const PlasmaNeutral& n) { return n.density > 0; });
    const bool collides = plasma.sheath_options.collisions && plasma.ion_energies.empty();
    if (plasma.gases.empty() || !(by_gas || collides)) unused.push_back("pressure");
    if (!by_gas && !(collides && !plasma.gases.empty())) unused.push_back("gas_temperature");
    for (const char* key : unused)
        if (entry[key].is_given) plasma.unused.push_back(std::string(key) + ": " + entry[key].text);
    if (plasma.gases.empty() || !(by_gas || collides))
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
        if (entry.is_good) {
            build_charges(entry, plasma, problems);
            build_sheath_options(entry, plasma);
            build_gas(entry, plasma, problems);
            for (const auto& [species, neutral] : entry["neutrals"].members)
                if (neutral.is_good) build_neutral(neutral, species, plasma, problems);
            build_bias(entry, result, plasma, problems);
            list_unused(entry, plasma);
            if (result.domain.revolved() && plasma.ion_tilt_deg > 0)
                problems.add(entry["ion_tilt"].at, entry["ion_tilt"].path,
                             "ions that lean are not round about the axis; a hole under them "
                             "needs symmetry: full");
        }
        result.plasmas.emplace(name, std::move(plasma));
    }
}

} // namespace rille::engine
