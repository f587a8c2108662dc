// SPDX-License-Identifier: Apache-2.0
#include "engine/collisions_file.hpp"

#include "engine/words.hpp"
#include "fluxes/cross_sections.hpp"

#include <fmt/format.h>

namespace rille::engine {

namespace {

using Kind = fluxes::CollisionProcess::Kind;
using Law = IonCollision::Law;

std::vector<double> read_numbers(const YamlNode* node, const Range& range, Problems& problems) {
    std::vector<double> numbers;
    if (!node) return numbers;
    if (!node->is_list()) {
        problems.add(node->at, node->path, "a list of numbers is due");
        return numbers;
    }
    for (const YamlNode& item : node->items)
        if (const auto number = read_number(item, range, problems)) numbers.push_back(*number);
    return numbers;
}

void read_table(const YamlNode& node, IonCollision& collision, Problems& problems) {
    MapReader map(node, problems);
    const std::size_t before = problems.size();
    collision.law = Law::table;
    collision.energy_ev = read_numbers(map.required("energy_eV"), above_zero(), problems);
    collision.table_nm2 = read_numbers(map.required("cross_section_m2"), zero_or_more(), problems);
    for (double& area : collision.table_nm2)
        area *= 1e18;
    const YamlNode* standing = map.required("standing");
    if (map.required("source") && standing)
        if (const auto word = read_word(
                *standing, {"measured", "published", "from memory", "illustrative"}, problems))
            for (const auto each : {fluxes::Standing::measured, fluxes::Standing::published,
                                    fluxes::Standing::from_memory, fluxes::Standing::illustrative})
                if (*word == standing_word(each)) collision.standing[each] = 1;
    map.finish();
    if (problems.size() != before) return;
    if (collision.energy_ev.size() != collision.table_nm2.size() || collision.energy_ev.size() < 2)
        problems.add(node.at, node.path,
                     fmt::format("{} energies and {} cross sections; as many of both are due, at "
                                 "least two",
                                 collision.energy_ev.size(), collision.table_nm2.size()));
    for (std::size_t i = 1; i < collision.energy_ev.size(); ++i)
        if (!(collision.energy_ev[i] > collision.energy_ev[i - 1])) {
            problems.add(node.at, node.path, "the energies must increase");
            break;
        }
}

void read_law(const YamlNode& law, MapReader& map, ParameterReader& parameters,
              IonCollision& collision, Problems& problems) {
    const auto word = read_word(law, {"capture", "phelps-argon"}, problems);
    if (!word) return;
    if (*word == "capture") {
        collision.law = Law::capture;
        collision.polarisability_nm3 =
            parameters.value(map.required("polarisability"), {Dimension::volume, above_zero()});
        return;
    }
    collision.law = Law::phelps_argon;
    collision.exponent = parameters.value(map.required("exponent"), {{}, {1, 4}}, 2.3);
    if (collision.ion != "Ar+" || collision.gas != "Ar")
        problems.add(law.at, law.path, "this law is that of Ar+ in Ar");
}

IonCollision read_collision(const YamlNode& node, Problems& problems) {
    IonCollision collision;
    ParameterReader parameters(problems);
    MapReader map(node, problems);
    if (const YamlNode* ion = map.required("ion"))
        collision.ion = read_text(*ion, problems).value_or("");
    if (const YamlNode* gas = map.required("gas"))
        collision.gas = read_text(*gas, problems).value_or("");
    const YamlNode* law = map.optional("law");
    const YamlNode* table = map.optional("table");
    const YamlNode* constant = map.optional("cross_section");
    if ((law != nullptr) + (table != nullptr) + (constant != nullptr) != 1)
        problems.add(node.at, node.path, "one of law, table and cross_section is due");
    else if (law)
        read_law(*law, map, parameters, collision, problems);
    else if (table)
        read_table(*table, collision, problems);
    else
        collision.cross_section_nm2 = parameters.value(constant, {Dimension::area, zero_or_more()});
    if (collision.law != Law::phelps_argon)
        if (const YamlNode* kind = map.required("kind"))
            collision.kind =
                read_word(*kind, {"charge exchange", "isotropic"}, problems).value_or("") ==
                        "isotropic"
                    ? Kind::isotropic
                    : Kind::charge_exchange;
    map.finish();
    for (const auto& [standing, count] : parameters.counts())
        collision.standing[standing] += count;
    return collision;
}

} // namespace

std::vector<IonCollision> read_collisions(const std::string& path, const std::string& shown,
                                          Problems& problems) {
    std::vector<IonCollision> collisions;
    const std::size_t before = problems.size();
    const YamlNode root = read_yaml_file(path, problems, shown);
    if (problems.size() != before) return collisions;
    MapReader map(root, problems);
    if (const YamlNode* format = map.required("format")) read_integer(*format, {1, 1}, problems);
    const YamlNode* list = map.required("collisions");
    map.finish();
    if (!list) return collisions;
    if (!list->is_list()) problems.add(list->at, list->path, "a list of collisions is due");
    for (const YamlNode& item : list->items)
        collisions.push_back(read_collision(item, problems));
    return collisions;
}

std::vector<fluxes::CollisionProcess> processes_of(const IonCollision& collision,
                                                   double ion_mass_amu, double gas_mass_amu,
                                                   double gas_density) {
    switch (collision.law) {
    case Law::phelps_argon:
        return fluxes::argon_in_argon(gas_density, {collision.exponent});
    case Law::capture:
        return {fluxes::capture_process(collision.kind, ion_mass_amu, collision.gas, gas_mass_amu,
                                        gas_density, collision.polarisability_nm3)};
    case Law::constant:
        return {fluxes::constant_process(collision.kind, collision.gas, gas_mass_amu, gas_density,
                                         collision.cross_section_nm2)};
    case Law::table:
        break;
    }
    return {{collision.kind, collision.gas, gas_mass_amu, gas_density, collision.energy_ev,
             collision.table_nm2}};
}

} // namespace rille::engine
