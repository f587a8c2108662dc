// SPDX-License-Identifier: Apache-2.0
#include "engine/units.hpp"

#include "engine/words.hpp"

#include <fmt/format.h>

#include <array>
#include <charconv>
#include <cmath>
#include <map>

namespace rille::engine {

namespace {

constexpr double elementary_charge_c = 1.602176634e-19; // SI definition of 2019, exact
constexpr double avogadro_per_mol = 6.02214076e23;      // SI definition of 2019, exact
constexpr double joule_per_mol = 1.0 / (avogadro_per_mol * elementary_charge_c); // in eV
// 1 torr = 101325/760 Pa, by definition.
constexpr double torr_pa = 101325.0 / 760.0;
// 1 mA/cm2 of singly charged ions = 1e-3 / e per cm2 and s; 1 cm2 = 1e14 nm2.
constexpr double ma_per_cm2 = 1e-3 / elementary_charge_c * 1e-14;

struct DimensionInfo {
    const char* noun;
    const char* example;
    std::vector<UnitDefinition> units;
};

std::vector<UnitDefinition> flux_units() {
    return {{"/cm2/s", 1e-14},  {"/nm2/s", 1.0},     {"/m2/s", 1e-18},  {"cm-2 s-1", 1e-14},
            {"nm-2 s-1", 1.0},  {"m-2 s-1", 1e-18},  {"/cm²/s", 1e-14}, {"/(cm2 s)", 1e-14},
            {"1/cm2/s", 1e-14}, {"1/(cm2 s)", 1e-14}};
}

std::vector<UnitDefinition> ion_flux_units() {
    std::vector<UnitDefinition> units = {{"mA/cm2", ma_per_cm2},
                                         {"A/m2", 0.1 * ma_per_cm2},
                                         {"uA/cm2", 1e-3 * ma_per_cm2},
                                         {"mA/cm²", ma_per_cm2}};
    for (const UnitDefinition& unit : flux_units())
        units.push_back(unit);
    return units;
}

const DimensionInfo& info(Dimension dimension) {
    static const std::map<Dimension, DimensionInfo> table = {
        {Dimension::length,
         {"a length",
          "60 nm",
          {{"nm", 1}, {"um", 1e3}, {"angstrom", 0.1}, {"mm", 1e6}, {"µm", 1e3}, {"μm", 1e3}}}},
        {Dimension::area,
         {"an area", "707 cm2", {{"cm2", 1e14}, {"m2", 1e18}, {"mm2", 1e12}, {"nm2", 1}}}},
        {Dimension::volume, {"a volume", "1.64e-30 m3", {{"nm3", 1}, {"m3", 1e27}}}},
        {Dimension::time,
         {"a time", "90 s", {{"s", 1}, {"min", 60}, {"ms", 1e-3}, {"us", 1e-6}, {"h", 3600}}}},
        {Dimension::energy,
         {"an energy",
          "0.3 eV",
          {{"eV", 1},
           {"meV", 1e-3},
           {"keV", 1e3},
           {"kJ/mol", 1e3 * joule_per_mol},
           {"kcal/mol", 4184 * joule_per_mol}}}},
        {Dimension::temperature,
         {"an absolute temperature",
          "50 degC or 323 K",
          {{"K", 1}, {"degC", 1, 273.15}, {"°C", 1, 273.15}}}},
        {Dimension::temperature_step, {"a temperature difference", "5 K", {{"K", 1}}}},
        {Dimension::pressure,
         {"a pressure",
          "8 mTorr",
          {{"mTorr", 1e-3 * torr_pa},
           {"Pa", 1},
           {"Torr", torr_pa},
           {"mbar", 100},
           {"ubar", 0.1},
           {"kPa", 1e3}}}},
        {Dimension::voltage, {"a voltage", "120 V", {{"V", 1}, {"kV", 1e3}, {"mV", 1e-3}}}},
        {Dimension::frequency,
         {"a frequency", "13.56 MHz", {{"MHz", 1e6}, {"kHz", 1e3}, {"Hz", 1}, {"GHz", 1e9}}}},
        {Dimension::angle, {"an angle", "88 deg", {{"deg", 1}, {"°", 1}}}},
        {Dimension::flux, {"a particle flux", "3e18 /cm2/s", flux_units()}},
        {Dimension::ion_flux, {"an ion flux or current density", "1.1 mA/cm2", ion_flux_units()}},
        {Dimension::number_density,
         {"a number density",
          "5e22 /cm3",
          {{"/cm3", 1e-21},
           {"/nm3", 1},
           {"/m3", 1e-27},
           {"cm-3", 1e-21},
           {"nm-3", 1},
           {"m-3", 1e-27},
           {"1/cm3", 1e-21}}}},
        {Dimension::site_density,
         {"a density of sites",
          "6.78e14 /cm2",
          {{"/cm2", 1e-14}, {"/nm2", 1}, {"/m2", 1e-18}, {"cm-2", 1e-14}, {"nm-2", 1}}}},
        {Dimension::mass_density,
         {"a mass density", "2.33 g/cm3", {{"g/cm3", 1}, {"kg/m3", 1e-3}}}},
        {Dimension::mass, {"a mass", "35.45 amu", {{"amu", 1}, {"g/mol", 1}}}},
        {Dimension::share, {"a share", "30 %", {{"%", 0.01}}}},
        {Dimension::power, {"a power", "1500 W", {{"W", 1}, {"kW", 1e3}}}},
        {Dimension::gas_flow, {"a gas flow", "38 sccm", {{"sccm", 1}, {"slm", 1e3}}}},
        {Dimension::rate,
         {"a rate",
          "200 nm/min",
          {{"nm/min", 1.0 / 60},
           {"nm/s", 1},
           {"um/min", 1e3 / 60},
           {"angstrom/min", 0.1 / 60},
           {"angstrom/s", 0.1}}}},
    };
    return table.at(dimension);
}

struct Hint {
    Dimension dimension;
    const char* unit;
    const char* sentence;
};

// Units that mean two things, or that a reader of another field would write.
constexpr std::array<Hint, 24> hints = {{
    {Dimension::length, "A", "\"A\" may be ampere or angstrom: write angstrom"},
    {Dimension::length, "Å", "write angstrom"},
    {Dimension::length, "m", "\"m\" may be metre or a slip for nm: write nm, um or mm"},
    {Dimension::length, "micron", "write um"},
    {Dimension::length, "u", "write um"},
    {Dimension::time, "m", "\"m\" may be metre or minute: write min"},
    {Dimension::time, "sec", "write s"},
    {Dimension::temperature, "C", "\"C\" may be coulomb or degree Celsius: write degC"},
    {Dimension::temperature, "deg", "\"deg\" is an angle: write degC or K"},
    {Dimension::temperature, "F", "write degC or K"},
    {Dimension::temperature, "eV", "temperatures of neutrals and of the wafer are in K or degC"},
    {Dimension::temperature_step, "degC",
     "a difference is written in K; degC is for absolute "
     "temperatures only"},
    {Dimension::energy, "K",
     "temperatures of electrons and ions are written in eV (11604.5 K = "
     "1 eV)"},
    {Dimension::energy, "V", "\"V\" is a voltage: write eV"},
    {Dimension::pressure, "mT", "\"mT\" may be millitesla or millitorr: write mTorr"},
    {Dimension::pressure, "T", "\"T\" may be tesla or torr: write Torr"},
    {Dimension::pressure, "mtorr", "write mTorr"},
    {Dimension::voltage, "eV", "\"eV\" is an energy: write V"},
    {Dimension::voltage, "W", "\"W\" is a power; a voltage is due here"},
    {Dimension::angle, "rad", "write deg"},
    {Dimension::angle, "°C", "\"°C\" is a temperature: write deg"},
    {Dimension::flux, "mA/cm2",
     "a current density is for ions; neutrals carry no charge: write "
     "/cm2/s"},
    {Dimension::mass, "u", "write amu"},
    {Dimension::share, "percent", "write %"},
}};

std::string foreign_unit(const std::string& text, const std::string& unit, Dimension due) {
    for (const Hint& hint : hints)
        if (hint.dimension == due && unit == hint.unit) return hint.sentence;
    std::vector<std::string> known;
    for (const UnitDefinition& own : units_of(due))
        known.emplace_back(own.text);
    for (int d = 0; d <= static_cast<int>(Dimension::rate); ++d)
        for (const UnitDefinition& other : units_of(static_cast<Dimension>(d)))
            if (unit == other.text)
                return fmt::format("{} is {}; {} is due", quoted(text),
                                   noun(static_cast<Dimension>(d)), noun(due));
    return fmt::format("unknown unit {}{}", quoted(unit), did_you_mean(unit, known));
}

bool is_digit(char c) {
    return c >= '0' && c <= '9';
}

/// Length of the decimal number at the start of text; 0 if there is none.
std::size_t number_length(const std::string& text) {
    std::size_t at = !text.empty() && (text[0] == '+' || text[0] == '-') ? 1 : 0;
    std::size_t digits = 0;
    for (; at < text.size() && is_digit(text[at]); ++at)
        ++digits;
    if (at < text.size() && text[at] == '.')
        for (++at; at < text.size() && is_digit(text[at]); ++at)
            ++digits;
    if (digits == 0) return 0;
    if (at < text.size() && (text[at] == 'e' || text[at] == 'E')) {
        std::size_t power = at + 1;
        if (power < text.size() && (text[power] == '+' || text[power] == '-')) ++power;
        const std::size_t first = power;
        while (power < text.size() && is_digit(text[power]))
            ++power;
        if (power > first) at = power;
    }
    return at;
}

/// Ways of writing numbers that other readers take for something else; empty if none applies.
std::string number_trap(const std::string& text, const std::string& number,
                        const std::string& rest) {
    const std::string low = lower_case(text);
    for (const char* word : {".nan", ".inf", "-.inf", "+.inf", "nan", "inf", "-inf", "infinity"})
        if (low.rfind(word, 0) == 0 &&
            (low.size() == std::string(word).size() || low[std::string(word).size()] == ' '))
            return quoted(text) + " is not a finite number";
    if (number.empty()) return quoted(text) + " is not a number";
    if (number == "0" && !rest.empty() && (rest[0] == 'x' || rest[0] == 'o'))
        return quoted(text) + ": write the number in decimal";
    if (!rest.empty() && rest[0] == ':' && rest.size() > 1 && is_digit(rest[1]))
        return quoted(text) + " reads as a number to base 60 in YAML: write it with a unit, for "
                              "example 90 s";
    const std::size_t sign = number[0] == '+' || number[0] == '-';
    if (number.size() > sign + 1 && number[sign] == '0' && is_digit(number[sign + 1]))
        return quoted(text) + " has a leading zero (octal to YAML): write it without";
    if (!rest.empty() && rest[0] == '_')
        return quoted(text) + ": write numbers without separators between digits";
    if (!rest.empty() && rest[0] == ',' && rest.size() > 1 && is_digit(rest[1]))
        return quoted(text) + ": write the decimal point as a dot, and no thousands separators";
    if (text.find('#') != std::string::npos)
        return quoted(text) + ": a comment needs a space before #";
    return "";
}

} // namespace

const std::vector<UnitDefinition>& units_of(Dimension dimension) {
    return info(dimension).units;
}
const char* noun(Dimension dimension) {
    return info(dimension).noun;
}
std::string example(Dimension dimension) {
    return info(dimension).example;
}

std::string unit_list(Dimension dimension) {
    std::vector<std::string> plain; // spellings of the same unit are not repeated
    for (const UnitDefinition& unit : units_of(dimension)) {
        const std::string text = unit.text;
        bool ascii = text[0] != '1' && text.find('(') == std::string::npos;
        for (const char c : text)
            ascii = ascii && static_cast<unsigned char>(c) < 0x80;
        const bool powers =
            text.find("-2") != std::string::npos || text.find("-3") != std::string::npos;
        if (ascii && !powers) plain.push_back(text);
    }
    return listed(plain);
}

NumberText split_number(const std::string& raw) {
    const std::string text = trimmed(raw);
    const std::size_t length = number_length(text);
    NumberText result;
    const std::string number = text.substr(0, length), rest = text.substr(length);
    result.error = number_trap(text, number, rest);
    if (!result.error.empty()) return result;
    result.unit = trimmed(rest);
    const char* first = number.data() + (number[0] == '+');
    const auto read = std::from_chars(first, number.data() + number.size(), result.value);
    if (read.ec != std::errc() || !std::isfinite(result.value))
        result.error = quoted(text) + " is not a finite number";
    return result;
}

QuantityText parse_quantity(const std::string& text, Dimension dimension) {
    const NumberText number = split_number(text);
    const std::string form =
        fmt::format("for example {} ({})", example(dimension), unit_list(dimension));
    if (!number.error.empty())
        return {0, fmt::format("{}; {} is due, {}", number.error, noun(dimension), form)};
    if (number.unit.empty())
        return {0, fmt::format("{} has no unit; {} is due, {}", quoted(trimmed(text)),
                               noun(dimension), form)};
    for (const UnitDefinition& unit : units_of(dimension))
        if (number.unit == unit.text) return {unit.factor * (number.value + unit.offset), ""};
    return {0, fmt::format("{}; {}", foreign_unit(trimmed(text), number.unit, dimension), form)};
}

std::string format_quantity(double inside, Dimension dimension) {
    const UnitDefinition& unit = units_of(dimension).front();
    return fmt::format("{:.12g} {}", inside / unit.factor - unit.offset, unit.text);
}

} // namespace rille::engine
