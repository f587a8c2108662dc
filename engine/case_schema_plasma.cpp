// SPDX-License-Identifier: Apache-2.0
#include "engine/case_schema_parts.hpp"

namespace rille::engine {

namespace {

using D = Dimension;

Range positive_share() {
    return {0, 1, true, false};
}

/// Keys of one imported distribution; either the table of energies or the analyser's curve.
Rule ion_table_rule(const std::string& key) {
    return map_rule(
        key,
        {text_rule("file", "CSV table of the distribution, relative to the case file").required(),
         word_rule("referenced_to", {"wafer"}, "surface to which the energies refer")
             .by_default("wafer"),
         quantity_rule("transverse_temperature", D::energy, zero_or_more(),
                       "spread across the field, for tables of energy only; default: "
                       "ion_transverse_temperature")},
        "a table of energies, or of energies and angles");
}

Rule retarding_curve_rule(const std::string& key) {
    return map_rule(
        key,
        {text_rule("retarding_curve", "CSV with the columns voltage_V and current_A: collector "
                                      "current against retarding voltage")
             .required(),
         quantity_rule("smoothing", D::voltage, above_zero(),
                       "half width of the sliding parabola whose slope is taken; it widens every "
                       "peak by about that much")
             .required(),
         word_rule("referenced_to", {"wafer", "ground"},
                   "potential from which the retarding voltage counts")
             .required(),
         quantity_rule("wafer_potential", D::voltage, {},
                       "mean potential of the wafer against ground, for referenced_to: ground")
             .by_default("0 V"),
         quantity_rule("transverse_temperature", D::energy, zero_or_more(),
                       "spread across the field: the analyser does not see angles")
             .required()},
        "a retarding-field analyser's curve; it does not tell ions apart, so their shares must be "
        "known otherwise");
}

Rule ion_energies_rule() {
    const Rule curve = retarding_curve_rule("*");
    const Rule one =
        alternatives_rule("", "retarding_curve", {ion_table_rule(""), curve}, "one table or curve")
            .required();
    const Rule each = dictionary_rule("", one, "one table or curve for each ion, by its name");
    const Rule table = alternatives_rule("", "file", {each, ion_table_rule("*")},
                                         "one table for all ions, or one for each by name");
    return alternatives_rule("ion_energies", "retarding_curve", {table, curve},
                             "measured or computed energy (and angle) distribution at the wafer; "
                             "one for all ions, or one for each by name");
}

Rule component_rule() {
    return map_rule(
        "",
        {quantity_rule("frequency", D::frequency, above_zero(), "of this part").required(),
         quantity_rule("amplitude", D::voltage, above_zero(), "half of peak to peak").required(),
         quantity_rule("phase", D::angle, {-360, 360}, "of a cosine").by_default("0 deg")},
        "one sinusoidal part");
}

Rule rf_bias_rule() {
    const Rule rectangular = map_rule(
        "rectangular",
        {quantity_rule("high", D::voltage, {}, "upper level at the electrode").required(),
         quantity_rule("low", D::voltage, {}, "lower level: ions are drawn while it lasts")
             .required(),
         quantity_rule("high_for", D::share, {0, 1, true, true}, "share of the period at high")
             .required()},
        "a pulsed voltage of two levels");
    Rule rule = map_rule(
        "rf_bias",
        {quantity_rule("frequency", D::frequency, above_zero(),
                       "of the bias; without it the sheath is steady (only with mean_sheath)"),
         quantity_rule("amplitude", D::voltage, above_zero(),
                       "of the voltage at the wafer electrode: half of peak to peak"),
         quantity_rule("peak_to_peak", D::voltage, above_zero(),
                       "of the voltage at the wafer electrode"),
         quantity_rule("self_bias", D::voltage, above_zero(),
                       "how far the electrode's mean lies below ground, as a positive number"),
         quantity_rule("mean_sheath", D::voltage, zero_or_more(),
                       "mean voltage across the sheath above the wafer"),
         quantity_rule("power", D::power, above_zero(),
                       "bias power; needs electrode_area and delivered"),
         quantity_rule("electrode_area", D::area, above_zero(), "of the wafer electrode"),
         quantity_rule("delivered", D::share, positive_share(),
                       "share of the power that accelerates ions"),
         list_rule("components", component_rule(), "several frequencies at once"),
         text_rule("waveform", "CSV with the columns time_us and voltage_V: one period of the "
                               "electrode's voltage, first and last value equal"),
         rectangular,
         number_rule("area_ratio", above_zero(),
                     "area of the grounded surfaces over that of the wafer electrode; default: "
                     "so large that all of the voltage lies across the wafer's sheath"),
         number_rule("area_exponent", {0, 4}, "sheath voltages divide as the areas to this power")
             .by_default("2.5")},
        "what drives the sheath above the wafer; give one of amplitude, peak_to_peak, self_bias, "
        "mean_sheath, power, components, waveform and rectangular");
    rule.members.push_back(refused_rule(
        "voltage", "says too little; give amplitude, peak_to_peak, self_bias or mean_sheath"));
    return rule;
}

Rule pulse_rule() {
    return map_rule(
        "pulse",
        {quantity_rule("frequency", D::frequency, above_zero(), "how often it repeats").required(),
         quantity_rule("on", D::share, positive_share(),
                       "share of the time in which the bias is on")
             .required(),
         map_rule("off",
                  {quantity_rule("ion_flux", D::ion_flux, zero_or_more(),
                                 "while the bias is off; default: as while it is on"),
                   quantity_rule("electron_temperature", D::energy, zero_or_more(),
                                 "while the bias is off; default: as while it is on")},
                  "the plasma while the bias is off: the sheath then floats")
             .by_default("{}")},
        "a pulsed bias, slow against the ions' transit; ion_flux and rf_bias are those of the on "
        "time");
}

Rule sheath_rule() {
    return map_rule(
        "sheath",
        {word_rule("edge", {"fixed", "moving"},
                   "fixed: width of the mean voltage; moving: the edge follows the voltage through "
                   "uniform ions")
             .by_default("fixed"),
         word_rule("collisions", {"included", "ignored"},
                   "charge exchange and scattering, where pressure and gas are given")
             .by_default("included"),
         text_rule("cross_sections", "YAML file of collisions; default: ion_collisions of configs"),
         integer_rule("trajectories", {1000, 10000000},
                      "ions followed through a sheath with collisions")
             .by_default("100000")},
        "how ions are taken through the sheath");
}

std::vector<Rule> state_rules() {
    return {
        quantity_rule("electron_temperature", D::energy, above_zero(),
                      "of the electrons; half of it adds to the energy of the ions")
            .by_default("3 eV"),
        quantity_rule("ion_flux", D::ion_flux, zero_or_more(),
                      "all ions together at the wafer; or give electron_density"),
        quantity_rule("electron_density", D::number_density, above_zero(),
                      "in the bulk of the plasma; or give ion_flux"),
        quantity_rule("edge_to_bulk", D::share, positive_share(),
                      "electron density at the sheath edge over that of the bulk; default: a "
                      "presheath without collisions, exp(-1/2)")
            .by_default("60.653 %"),
        map_rule("negative_ions",
                 {number_rule("edge_ratio", zero_or_more(),
                              "negative ions over electrons at the sheath edge")
                      .required(),
                  quantity_rule("temperature", D::energy, above_zero(), "of the negative ions")
                      .required()},
                 "slow the positive ions down at the edge"),
        word_rule("bohm_speed", {"own", "common"},
                  "own: each ion leaves at its own Bohm speed; common: all at the sound speed of "
                  "the mixture")
            .by_default("own"),
    };
}

Rule neutrals_rule() {
    Rule neutral =
        map_rule("",
                 {quantity_rule("flux", D::flux, zero_or_more(), "flux at the open wafer surface"),
                  quantity_rule("partial_pressure", D::pressure, zero_or_more(),
                                "in the gas; the flux is then n v / 4"),
                  quantity_rule("temperature", D::temperature, above_zero(),
                                "of this neutral in the gas; default: gas_temperature")},
                 "one neutral; without flux and partial_pressure it comes from pressure, flows and "
                 "dissociation");
    Rule neutrals = dictionary_rule("neutrals", neutral, "neutrals that reach the wafer, by name");
    neutrals.members.push_back(
        later_rule("from", "fluxes cannot be found from monitor rates; give each flux"));
    neutrals.members.push_back(
        later_rule("unknown", "fluxes cannot be found from monitor rates; give each flux"));
    return neutrals.by_default("{}");
}

Rule dissociation_rule() {
    const Rule one = map_rule(
        "",
        {quantity_rule("fraction", D::share, {0, 1}, "of the molecules that are split").required(),
         dictionary_rule("into", integer_rule("", {1, 100}, "pieces of one molecule").required(),
                         "what one molecule becomes, by name with counts")
             .required()},
        "one gas");
    return dictionary_rule("dissociation", one, "how much of each gas is split, by its name");
}

} // namespace

Rule plasma_rule() {
    const char* unused = " (kept with the result, not used by the model)";
    std::vector<Rule> members = {
        text_rule("from", "name of a plasma to copy; keys given here replace the copied ones"),
        map_rule("state",
                 {text_rule("table", "CSV of plasma states by set points").required(),
                  dictionary_rule("at", text_rule("", "value with its unit").required(),
                                  "set points at which the table is read, by column")
                      .required()},
                 "values of this plasma from a table, interpolated"),
        quantity_rule("pressure", D::pressure, above_zero(),
                      "of the gas: collisions in the sheath, fluxes of neutrals"),
        dictionary_rule(
            "flows", quantity_rule("", D::gas_flow, zero_or_more(), "flow of one gas").required(),
            "gas flows; their shares are taken for those of the pressure"),
        dissociation_rule(),
        quantity_rule("source_power", D::power, zero_or_more(),
                      std::string("source power") + unused),
        quantity_rule("source_frequency", D::frequency, above_zero(),
                      std::string("source frequency") + unused),
        quantity_rule("gas_temperature", D::temperature, above_zero(), "of the gas")
            .by_default("300 K")};
    for (Rule& rule : state_rules())
        members.push_back(std::move(rule));
    members.push_back(dictionary_rule(
        "ions", quantity_rule("", D::share, {0, 1}, "share of the ion flux").required(),
        "ions by name with their shares, 100 % in all"));
    members.push_back(
        quantity_rule("ion_transverse_temperature", D::energy, zero_or_more(),
                      "of the ions across the field at the sheath edge: sets their spread in angle")
            .by_default("0.1 eV"));
    members.push_back(map_rule(
        "ion_tilt",
        {quantity_rule("angle", D::angle, {0, 45}, "mean direction of ions from the wafer normal")
             .required(),
         quantity_rule("azimuth", D::angle, {-360, 360}, "where they head, from +x towards +y")
             .by_default("0 deg")},
        "all ions lean, as near the wafer's edge"));
    members.push_back(ion_energies_rule());
    members.push_back(neutrals_rule());
    members.push_back(rf_bias_rule());
    members.push_back(pulse_rule());
    members.push_back(sheath_rule().by_default("{}"));
    return map_rule("", members, "one state of the plasma");
}

} // namespace rille::engine
