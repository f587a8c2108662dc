// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/run_result.hpp"

#include <string>

namespace rille::engine {

/// profile.csv: one line per surface element, in the order of the surface; every column's unit at
/// the end of its name (`_1` = dimensionless). Positions are element centres. extruded: arc length
/// runs along each chain from its start to the element's centre, normal_deg = atan2(n.x, n.z);
/// full: y, area and the normal's components instead. `sampling_error_nm` is the 95 % sampling
/// error of the element's position along its normal.
std::string profile_csv(const Case&, const SurfaceState&);

/// What profile.csv and files like it say of an element's place: names of the columns, and their
/// values for element e. `arc` is arc_length() of the surface, empty in full.
std::string place_header(const Case&);
std::string place_row(const Case&, const geometry::Surface&, const std::vector<double>& arc,
                      std::size_t e);
/// Material and film of an element, each after a comma; empty where they are not known.
std::string material_row(const Case&, const SurfaceState&, std::size_t e);

/// 95 % half-width of a value with one deviation per batch: t SE with
/// SE^2 = sum w_b^2 / (B (B - 1)) and Student's t for B - 1 degrees of freedom (2.365 for 8
/// batches). 0 for fewer than two batches.
double sampling_error(const std::vector<double>& batch_deviation);

/// Distance along each chain from its start to the element's centre [nm]; extruded only.
std::vector<double> arc_length(const geometry::Surface&);

} // namespace rille::engine
