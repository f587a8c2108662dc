// SPDX-License-Identifier: Apache-2.0
// What is varied: lists, ranges and the plan that combines them.
#include "engine/study/study_plan.hpp"

#include "engine/csv_rows.hpp"
#include "engine/words.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <map>

namespace rille::engine {

namespace {

using PlanKind = Study::Plan::Kind;

AxisValue value_of(const YamlNode& node) {
    AxisValue value;
    value.node = node;
    return value;
}

AxisValue ranged_value(double number, const std::string& unit, const Location& at) {
    AxisValue value;
    value.node = number_node(number, unit == "1" ? "" : unit, at);
    value.text = value.node.text;
    value.number = split_number(value.text).value; // what the text says, to its last digit
    return value;
}

/// `share` of the way between two values, ends exact.
double between(double from, double to, double share, bool is_log) {
    if (share <= 0 || share >= 1) return share <= 0 ? from : to;
    return is_log ? from * std::pow(to / from, share) : from + share * (to - from);
}

struct AxisReader {
    StudyReading& r;
    const Entry& entry;
    Axis axis;

    void wrong(const Location& at, const std::string& message) {
        r.problems.add(at, entry.path, message);
    }
    const Rule& rule() const { return *r.rules[axis.column]; }

    void read_list() {
        for (const Entry& item : entry.items)
            axis.values.push_back(value_of(item.raw));
        if (entry.items.empty()) return;
        check_values(r, axis.column, axis.values);
        StudyColumn& column = r.study.columns[axis.column];
        give_numbers(axis.values, rule(), column.unit);
        for (std::size_t v = 0; v < axis.values.size(); ++v)
            for (std::size_t u = 0; u < v; ++u)
                if (axis.values[u].text == axis.values[v].text)
                    return wrong(axis.values[v].node.at,
                                 fmt::format("{} stands twice in the list; repeats are asked for "
                                             "by repeats",
                                             quoted(axis.values[v].text)));
    }

    /// Both ends, checked by the rule of the value and against each other; false if they are wrong.
    bool read_ends() {
        axis.values = {value_of(entry["from"].raw), value_of(entry["to"].raw)};
        const std::size_t before = r.problems.size();
        check_values(r, axis.column, axis.values);
        if (r.problems.size() != before) return false;
        const Location &from = axis.values[0].node.at, &to = axis.values[1].node.at;
        const NumberText low = split_number(axis.values[0].text);
        const NumberText high = split_number(axis.values[1].text);
        give_numbers(axis.values, rule(), r.study.columns[axis.column].unit);
        axis.unit = low.unit;
        axis.is_log = entry["scale"].text == "log";
        axis.is_whole = rule().kind == Rule::Kind::integer;
        r.study.columns[axis.column].is_logarithmic = axis.is_log;
        if (!low.error.empty() || !high.error.empty())
            wrong(low.error.empty() ? to : from, "a range goes from one number to another; name "
                                                 "the values in a list");
        else if (low.unit != high.unit)
            wrong(to, fmt::format("{} and {} have different units; write both ends in one",
                                  quoted(axis.values[0].text), quoted(axis.values[1].text)));
        else if (low.value == high.value)
            wrong(to, "both ends are the same value");
        else if (axis.is_log && !(low.value > 0 && high.value > 0))
            wrong(low.value > 0 ? to : from, "a log range has ends above 0");
        return r.problems.size() == before;
    }

    void read_range() {
        const Entry& points = entry["points"];
        const bool draws = r.plan.kind != PlanKind::full_grid;
        const std::size_t before = r.problems.size();
        if (!entry["from"].is_good || !entry["to"].is_good || !read_ends()) return;
        if (draws && points.is_given)
            wrong(points.at, "the plan says how many points there are; leave this out");
        if (!draws && !points.is_given)
            wrong(entry.at,
                  "a full grid needs to know how many values; give points, for example 8");
        if (r.problems.size() != before || (!draws && !points.is_good)) return;
        axis.is_drawn = draws;
        if (draws) return;
        const AxisValue low = axis.values[0], high = axis.values[1];
        const auto count = static_cast<std::size_t>(points.number);
        axis.values.clear();
        for (std::size_t i = 0; i < count; ++i) {
            const double share = static_cast<double>(i) / static_cast<double>(count - 1);
            axis.values.push_back(ranged_value(
                between(*low.number, *high.number, share, axis.is_log), axis.unit, entry.at));
        }
        axis.values.front() = low;
        axis.values.back() = high;
        check_whole();
    }

    void check_whole() {
        if (!axis.is_whole) return;
        for (const AxisValue& value : axis.values)
            if (*value.number != std::floor(*value.number))
                return wrong(entry.at, fmt::format("{} is not a whole number; choose points so "
                                                   "that the steps are whole",
                                                   quoted(value.text)));
    }
};

void read_plan(StudyReading& r) {
    const Entry& plan = r.root["plan"];
    r.study.plan = "full grid";
    if (plan.members.empty()) return;
    const Entry* chosen = nullptr;
    for (const auto& [key, entry] : plan.members) {
        if (!entry.is_given) continue;
        if (chosen)
            r.problems.add(entry.at, entry.path, "the plan is given already; give one");
        else
            r.study.plan = key;
        chosen = &entry;
    }
    if (!chosen) return;
    r.plan.kind = r.study.plan == "sobol"   ? PlanKind::sobol
                  : r.study.plan == "table" ? PlanKind::table
                                            : PlanKind::latin_hypercube;
    r.plan.drawn = static_cast<std::size_t>((*chosen)["points"].number);
    r.plan.seed = static_cast<std::uint64_t>((*chosen)["seed"].number);
    if (r.plan.kind == PlanKind::table) read_points_table(r, *chosen);
}

/// Whether anything in the case is drawn: ions and neutrals arrive along random directions.
bool is_random(const Case& c) {
    for (const auto& [name, plasma] : c.plasmas) {
        if (plasma.ion_flux > 0 || plasma.bulk_electron_density > 0) return true;
        for (const PlasmaNeutral& neutral : plasma.neutrals)
            if (neutral.flux > 0 || neutral.density > 0) return true;
    }
    return false;
}

void read_repeats(StudyReading& r) {
    const Entry& repeats = r.root["repeats"];
    if (!repeats.is_good || repeats.number < 2) return;
    if (!is_random(r.study.base)) {
        r.problems.add(repeats.at, repeats.path,
                       "nothing in the case is random: every repeat would be the same");
        return;
    }
    const auto column = add_column(r, "sampling.seed", repeats.at);
    if (!column) return;
    r.study.columns[*column].unit = "1";
    for (int i = 0; i < static_cast<int>(repeats.number); ++i)
        r.plan.seeds.push_back(r.study.base.seed + static_cast<std::uint64_t>(i));
}

void count_points(StudyReading& r) {
    double count = 1;
    std::string product;
    if (r.plan.kind == PlanKind::full_grid)
        for (const Axis& axis : r.plan.axes) {
            count *= static_cast<double>(axis.values.size());
            product += fmt::format("{}{}", product.empty() ? "" : " x ", axis.values.size());
        }
    else
        count = static_cast<double>(r.plan.drawn);
    if (!r.plan.seeds.empty()) {
        if (product.empty()) product = std::to_string(r.plan.drawn);
        count *= static_cast<double>(r.plan.seeds.size());
        product += fmt::format(" x {} repeats", r.plan.seeds.size());
    }
    if (count > most_study_points) {
        const Entry& vary = r.root["vary"];
        r.problems.add(vary.is_given ? vary.at : r.root.at, "vary",
                       fmt::format("{} = {:.4g} points; a study has at most {:.0f}", product, count,
                                   most_study_points));
        return;
    }
    r.study.points = static_cast<std::size_t>(count);
}

} // namespace

AxisValue Axis::at_share(double u) const {
    if (!is_drawn)
        return values[std::min(values.size() - 1,
                               static_cast<std::size_t>(u * static_cast<double>(values.size())))];
    const double from = *values[0].number, to = *values[1].number;
    const Location& where = values[0].node.at;
    if (is_whole) {
        const double steps = std::floor(u * (std::abs(to - from) + 1));
        return ranged_value(from + (to > from ? steps : -steps), unit, where);
    }
    return ranged_value(between(from, to, u, is_log), unit, where);
}

void read_axes(StudyReading& r) {
    read_plan(r);
    const Entry& vary = r.root["vary"];
    const bool is_table = r.plan.kind == PlanKind::table;
    if (is_table && vary.is_given)
        r.problems.add(vary.at, vary.path,
                       "the table of points says what is varied; leave this "
                       "out");
    for (const auto& [path, entry] : vary.members) {
        if (is_table) break;
        const auto column = add_column(r, path, entry.at);
        if (!column || !entry.is_good) continue;
        AxisReader reader{r, entry, {}};
        reader.axis.column = *column;
        reader.axis.at = entry.at;
        if (entry.rule->kind == Rule::Kind::list)
            reader.read_list();
        else
            reader.read_range();
        r.plan.axes.push_back(std::move(reader.axis));
    }
    read_repeats(r);
    label_columns(r.study.columns);
    if (r.problems.empty()) count_points(r);
}

} // namespace rille::engine
