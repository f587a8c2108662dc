// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <string>
#include <vector>

namespace rille::engine {

/// What a value measures, with the unit it is held in inside the program.
enum class Dimension {
    length,           ///< nm
    area,             ///< nm2
    volume,           ///< nm3
    time,             ///< s
    energy,           ///< eV (also temperatures of charged species)
    temperature,      ///< K, absolute: degC allowed
    temperature_step, ///< K, a difference: degC refused
    pressure,         ///< Pa
    voltage,          ///< V
    frequency,        ///< Hz
    angle,            ///< deg
    flux,             ///< nm^-2 s^-1, neutral particles
    ion_flux,         ///< nm^-2 s^-1, singly charged ions; also as a current density
    number_density,   ///< nm^-3
    site_density,     ///< nm^-2
    mass_density,     ///< g/cm3
    mass,             ///< amu
    share,            ///< 1 (100 % = 1)
    power,            ///< W
    gas_flow,         ///< sccm
    rate,             ///< nm/s
};

struct UnitDefinition {
    const char* text; ///< as written
    double factor;    ///< inside = factor * (value + offset)
    double offset = 0;
};

/// The units that may be written for a dimension; the first is used for output.
const std::vector<UnitDefinition>& units_of(Dimension);
const char* noun(Dimension);      ///< "a length"
std::string unit_list(Dimension); ///< "nm, um or angstrom"
std::string example(Dimension);   ///< "60 nm"

/// A number as case files write it: decimal, optional exponent, finite, no leading zeros, no
/// digit grouping. `error` says what is wrong and how to write it; empty when `value` holds.
struct NumberText {
    double value = 0;
    std::string unit; ///< what follows the number, trimmed; empty for a bare number
    std::string error;
};
NumberText split_number(const std::string& text);

/// A value with its unit, in inside units. `error` as above; names the allowed units, and for
/// ambiguous or foreign units says what to write instead.
struct QuantityText {
    double value = 0;
    std::string error;
};
QuantityText parse_quantity(const std::string& text, Dimension);

/// Value in inside units with the dimension's first unit: "60 nm". Reads back within round-off.
std::string format_quantity(double inside, Dimension);

} // namespace rille::engine
