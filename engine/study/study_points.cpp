// SPDX-License-Identifier: Apache-2.0
#include "engine/study/sampling_plans.hpp"
#include "engine/study/study_plan.hpp"

#include "engine/words.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <set>
#include <stdexcept>

namespace rille::engine {

namespace {

using PlanKind = Study::Plan::Kind;

constexpr std::size_t most_checked_points = 200;

/// Place of a point on every axis: which value in a grid or table, or a share of the axis.
std::vector<AxisValue> axis_values(const Study::Plan& plan, std::size_t index) {
    std::vector<AxisValue> values(plan.axes.size());
    if (plan.kind == PlanKind::full_grid) {
        for (std::size_t a = plan.axes.size(); a-- > 0;) {
            const std::vector<AxisValue>& along = plan.axes[a].values;
            values[a] = along[index % along.size()];
            index /= along.size();
        }
        return values;
    }
    std::vector<double> u;
    if (plan.kind == PlanKind::sobol) u = sobol_point(plan.axes.size(), index);
    if (plan.kind == PlanKind::latin_hypercube)
        u = latin_hypercube_point(plan.axes.size(), plan.drawn, plan.seed, index);
    for (std::size_t a = 0; a < plan.axes.size(); ++a)
        values[a] = u.empty() ? plan.axes[a].values[index] : plan.axes[a].at_share(u[a]);
    return values;
}

std::size_t column_of(const Study& study, const std::string& path) {
    for (std::size_t c = 0; c < study.columns.size(); ++c)
        if (study.columns[c].path == path) return c;
    throw std::logic_error("no column " + path);
}

AxisValue seed_value(std::uint64_t seed) {
    AxisValue value;
    value.node.kind = YamlNode::Kind::scalar;
    value.node.text = value.text = std::to_string(seed);
    value.number = static_cast<double>(seed);
    return value;
}

/// Points that meet every value of every axis, both ends of ranges among them, as few as may be.
std::vector<std::size_t> covering_points(const Study& study, const Study::Plan& plan) {
    std::set<std::size_t> chosen;
    const std::size_t repeats = std::max<std::size_t>(1, plan.seeds.size());
    if (plan.kind == PlanKind::full_grid) {
        std::size_t longest = 1;
        for (const Axis& axis : plan.axes)
            longest = std::max(longest, axis.values.size());
        for (std::size_t k = 0; k < longest; ++k) {
            std::size_t index = 0;
            for (const Axis& axis : plan.axes)
                index = index * axis.values.size() + k % axis.values.size();
            chosen.insert(index * repeats);
        }
        chosen.insert((study.points / repeats - 1) * repeats);
    } else {
        const std::size_t step = std::max<std::size_t>(1, plan.drawn / most_checked_points);
        for (std::size_t k = 0; k < plan.drawn; k += step)
            chosen.insert(k * repeats);
    }
    std::vector<std::size_t> list(chosen.begin(), chosen.end());
    if (list.size() > most_checked_points) list.resize(most_checked_points);
    return list;
}

std::string described(const Study& study, const std::vector<AxisValue>& values) {
    std::string text;
    for (std::size_t c = 0; c < values.size(); ++c)
        text += (c ? ", " : "") + study.columns[c].label + " " + values[c].text;
    return text;
}

/// Linked values for every value along an axis, before any case is built.
void check_links(StudyReading& r) {
    for (const LinkedColumn& link : r.plan.linked)
        for (const Axis& axis : r.plan.axes) {
            if (axis.column != link.by) continue;
            if (axis.is_drawn && !link.is_interpolated) {
                r.problems.add(axis.at, r.study.columns[link.column].path,
                               fmt::format("{} holds rows, and this plan draws values between "
                                           "them; write {{table: {}, between: linear}}",
                                           link.file, link.file));
                continue;
            }
            for (const AxisValue& value : axis.values) {
                std::string reason;
                if (!link.at(value, reason))
                    r.problems.add(value.node.at, r.study.columns[link.column].path, reason);
            }
        }
}

} // namespace

std::vector<AxisValue> point_values(const Study& study, std::size_t index, Problems* problems) {
    const Study::Plan& plan = *study.design;
    if (index >= study.points) throw std::out_of_range("the study has no such point");
    std::vector<AxisValue> values(study.columns.size());
    const std::size_t repeats = std::max<std::size_t>(1, plan.seeds.size());
    std::vector<AxisValue> along = axis_values(plan, index / repeats);
    for (std::size_t a = 0; a < along.size(); ++a)
        values[plan.axes[a].column] = std::move(along[a]);
    if (!plan.seeds.empty())
        values[column_of(study, "sampling.seed")] = seed_value(plan.seeds[index % repeats]);
    for (const LinkedColumn& link : plan.linked) {
        std::string reason;
        const std::optional<AxisValue> value = link.at(values[link.by], reason);
        if (value)
            values[link.column] = *value;
        else if (problems)
            problems->add(values[link.by].node.at, study.columns[link.column].path, reason);
    }
    return values;
}

StudyPoint study_point(const Study& study, std::size_t index) {
    StudyPoint point;
    point.index = index;
    for (AxisValue& value : point_values(study, index))
        point.values.push_back({std::move(value.text), value.number});
    return point;
}

std::vector<std::string> point_overrides(const Study& study, const StudyPoint& point) {
    std::vector<std::string> overrides;
    const std::vector<AxisValue> values = point_values(study, point.index);
    for (std::size_t c = 0; c < values.size(); ++c)
        overrides.push_back(study.columns[c].path + "=" + to_yaml(values[c].node));
    return overrides;
}

std::string point_case(const Study& study, std::size_t index) {
    Problems problems;
    const BuiltCase built = build_point(study, index, false, problems);
    problems.throw_if_any();
    return built.result.resolved_yaml;
}

std::string point_name(const Study& study, std::size_t index) {
    const std::size_t width = std::max<std::size_t>(4, std::to_string(study.points).size());
    return fmt::format("{:0{}}", index + 1, width);
}

BuiltCase build_point(const Study& study, std::size_t index, bool with_arrivals,
                      Problems& problems) {
    YamlNode document = study.design->document;
    const std::vector<AxisValue> values = point_values(study, index, &problems);
    for (std::size_t c = 0; c < values.size(); ++c)
        if (!values[c].node.is_empty())
            set_value(document, study.columns[c].path, values[c].node, problems);
    return build_case(std::move(document), study.design->base_name, study.design->base_folder,
                      with_arrivals, problems);
}

void check_points(StudyReading& r) {
    check_links(r);
    if (!r.problems.empty()) return;
    for (const std::size_t index : covering_points(r.study, r.plan)) {
        Problems own;
        build_point(r.study, index, false, own);
        for (const Problem& problem : own.sorted()) {
            const Location at{problem.file, problem.line, problem.column};
            if (r.problems.any_at(at)) continue;
            const std::string where = fmt::format(" (at the point with {})",
                                                  described(r.study, point_values(r.study, index)));
            r.problems.add(at, problem.path, problem.message + where);
        }
        if (r.problems.size() > 20) break;
    }
}

} // namespace rille::engine
