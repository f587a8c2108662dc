// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <string>

namespace rille::engine {

/// The shortest decimal text that reads back as the same bits ("nan", "inf", "-inf" otherwise), so
/// that bitwise identical runs write identical files.
std::string shortest(double value);

/// A value as a person reads it, with no more decimals than its error deserves: error 0.34 gives
/// "60.12" -> "60.1". Between 0 and 2 decimals; error <= 0 means exact to what is shown.
std::string rounded(double value, double error = 0);
/// "60.1 ± 0.3"; errors below 0.005 read "± <0.01"; an error of exactly 0 is left out.
std::string with_error(double value, double error);

/// A CSV field: quoted only where it must be (RFC 4180).
std::string csv_field(const std::string& text);
/// A name made of letters, digits and `_+-.` only, for column headers and file names.
std::string column_name(const std::string& text);

} // namespace rille::engine
