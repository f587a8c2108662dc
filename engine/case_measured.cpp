// SPDX-License-Identifier: Apache-2.0
#include "engine/case_build.hpp"

#include "engine/words.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

namespace rille::engine {
namespace {

struct MeasuredReader {
    const Entry& measured;
    Case& result;
    Problems& problems;

    void wrong(const Entry& entry, const std::string& message) {
        problems.add(entry.at, entry.path, message);
    }

    /// The opening that the contour shows.
    const geometry::Opening* opening() {
        const Entry& name = measured["feature"];
        const auto& openings = result.mask.openings;
        if (openings.empty()) {
            problems.add(measured.at, measured.path, "there is no opening to compare with");
            return nullptr;
        }
        if (!name.is_good) return &openings.front();
        for (const geometry::Opening& one : openings)
            if (one.name == name.text) return &one;
        const std::vector<std::string> names = opening_names(result);
        wrong(name, fmt::format("no opening is called {}; there are: {}{}", quoted(name.text),
                                listed(names, 8), did_you_mean(name.text, names)));
        return nullptr;
    }

    /// A positive number before `unit`; the form has been promised by the table.
    std::optional<double> number_before(const Entry& entry, const std::string& unit) {
        const NumberText read = split_number(entry.text);
        if (read.error.empty() && read.unit == unit && read.value > 0) return read.value;
        wrong(entry, fmt::format("{}: a number above 0 with the unit {} is due", quoted(entry.text),
                                 unit));
        return std::nullopt;
    }

    /// "512, 40 px" or "0, 12 nm".
    std::array<double, 2> origin(const Entry& entry, bool in_pixels) {
        const std::size_t comma = entry.text.find(',');
        const std::string unit = in_pixels ? "px" : "nm";
        const NumberText x = split_number(entry.text.substr(0, comma));
        const NumberText y =
            split_number(comma == std::string::npos ? "" : entry.text.substr(comma + 1));
        const bool is_good = comma != std::string::npos && x.error.empty() && y.error.empty() &&
                             y.unit == unit && (x.unit.empty() || x.unit == unit);
        if (!is_good)
            wrong(entry, fmt::format("{}: two numbers with the unit {} are due, for example 512, "
                                     "40 {}{}",
                                     quoted(entry.text), unit, unit,
                                     in_pixels ? "" : " (with scale the points are in pixels)"));
        return {x.value, y.value};
    }

    /// "3 nm" or "0 to 4 nm".
    void cut_offset(const Entry& entry, MeasuredContour& contour) {
        if (result.domain.extruded()) {
            wrong(entry, "a trench is the same in every section: leave it out");
            return;
        }
        if (result.domain.revolved()) {
            wrong(entry, "revolved has the section through the axis; off it needs symmetry: full");
            return;
        }
        const std::size_t to = entry.text.find(" to ");
        std::string high = to == std::string::npos ? entry.text : entry.text.substr(to + 4);
        std::string low = to == std::string::npos ? entry.text : entry.text.substr(0, to);
        if (split_number(low).unit.empty()) low += " " + split_number(high).unit;
        const QuantityText least = parse_quantity(low, Dimension::length);
        const QuantityText most = parse_quantity(high, Dimension::length);
        for (const QuantityText* one : {&least, &most})
            if (!one->error.empty()) {
                wrong(entry, one->error);
                return;
            }
        if (least.value < 0 || least.value > most.value)
            wrong(entry, fmt::format("{}: a distance from 0, the smaller one first, is due",
                                     quoted(entry.text)));
        contour.cut_least = least.value;
        contour.cut_most = most.value;
    }

    void contour(const Entry& file, const geometry::Opening& feature) {
        MeasuredContour contour;
        contour.feature = feature.name;
        contour.source = file.text;
        ContourFrame frame;
        frame.axis_x = feature.centre_x;
        const std::size_t before = problems.size();
        const Entry& scale = measured["scale"];
        if (scale.is_good) frame.nm_per_px = number_before(scale, "nm/px");
        if (measured["origin"].is_good) frame.origin = origin(measured["origin"], scale.is_good);
        if (measured["rotation"].is_good) frame.rotation_deg = measured["rotation"].number;
        if (measured["cut_offset"].is_good) cut_offset(measured["cut_offset"], contour);
        if (problems.size() != before) return;
        contour.points = read_contour(file.text, frame, problems);
        const double side = result.domain.x_max();
        for (const auto& point : contour.points)
            if (std::abs(point[0]) > side * (1 + 1e-9)) {
                wrong(file,
                      fmt::format("the point x = {:.4g} nm, z = {:.4g} nm of the contour lies "
                                  "outside the period of {:.4g} nm; scale and origin?",
                                  point[0], point[1], 2 * side));
                return;
            }
        result.measured.contour = std::move(contour);
    }

    void read() {
        const geometry::Opening* feature = opening();
        if (!feature) return;
        const Entry& file = measured["contour"];
        for (const char* key : {"scale", "origin", "rotation", "cut_offset"})
            if (measured[key].is_good && !file.is_given)
                wrong(measured[key], "belongs to a contour, and there is none");
        if (file.is_good) contour(file, *feature);
        const Entry& table = measured["cd_table"];
        if (!table.is_good) return;
        std::vector<std::string> places;
        for (const auto& named : result.cd_places)
            places.push_back(named.first);
        result.measured.cds = read_cd_table(table.text, opening_names(result), places, problems);
    }
};

} // namespace

void build_measured(const Entry& root, Case& result, Problems& problems) {
    const Entry& measured = root["measured"];
    if (measured.is_good && measured.is_given) MeasuredReader{measured, result, problems}.read();
}

} // namespace rille::engine
