// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/problems.hpp"
#include "engine/yaml_reader.hpp"

#include <string>

namespace rille::engine {

/// Fills plasmas that have `state: {table: FILE, at: {SET POINT: VALUE, ...}}` from their table.
///
/// The table is a CSV whose first row names its columns with units, `source_power [W]`. Columns
/// that `at` names are set points; every other column is a key of the plasma
/// (`electron_density [/cm3]`, `ions.Ar+ [%]`, `neutrals.Cl.flux [/cm2/s]`), for which the value at
/// the set points is written into the document. The set points must fill a grid. Values are
/// interpolated linearly along each set point and never extrapolated. Keys that the plasma gives
/// itself are left alone. Paths of tables must be absolute by now.
void apply_state_tables(YamlNode& root, Problems&);

} // namespace rille::engine
