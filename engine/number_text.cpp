// SPDX-License-Identifier: Apache-2.0
#include "engine/number_text.hpp"

#include <algorithm>
#include <array>
#include <charconv>
#include <cmath>
#include <fmt/format.h>

namespace rille::engine {
namespace {

int decimals_for(double value, double error) {
    if (!(error > 0)) return std::fabs(value) < 1000 ? 2 : 1;
    // Two digits of an error that starts with 1, else one: the error itself is known to some 25 %.
    const double power = std::floor(std::log10(error));
    const bool starts_with_one = error / std::pow(10.0, power) < 1.95;
    return std::clamp(static_cast<int>(-power) + (starts_with_one ? 1 : 0), 0, 2);
}

} // namespace

std::string shortest(double value) {
    if (std::isnan(value)) return "nan";
    std::array<char, 32> buffer;
    const auto end = std::to_chars(buffer.data(), buffer.data() + buffer.size(), value);
    return std::string(buffer.data(), end.ptr);
}

std::string rounded(double value, double error) {
    std::string text = fmt::format("{:.{}f}", value, decimals_for(value, error));
    const bool zero = text.find_first_not_of("-0.") == std::string::npos;
    return zero && text.front() == '-' ? text.substr(1) : text;
}

std::string with_error(double value, double error) {
    if (!(error > 0)) return rounded(value);
    if (error < 0.005) return rounded(value) + " ± <0.01";
    return rounded(value, error) + " ± " +
           fmt::format("{:.{}f}", error, decimals_for(value, error));
}

std::string csv_field(const std::string& text) {
    if (text.find_first_of(",\"\r\n") == std::string::npos) return text;
    std::string quoted = "\"";
    for (const char c : text)
        quoted += c == '"' ? std::string("\"\"") : std::string(1, c);
    return quoted + '"';
}

std::string column_name(const std::string& text) {
    const auto plain = [](char c) {
        return (c >= '0' && c <= '9') || (c >= 'A' && c <= 'Z') || (c >= 'a' && c <= 'z') ||
               c == '+' || c == '-' || c == '.' || c == '_';
    };
    std::string name = text;
    std::replace_if(
        name.begin(), name.end(), [&](char c) { return !plain(c); }, '_');
    return name.empty() ? "unnamed" : name;
}

} // namespace rille::engine
