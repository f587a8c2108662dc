// SPDX-License-Identifier: Apache-2.0
#include "engine/case_build.hpp"

#include "engine/comparison.hpp"
#include "engine/metrics.hpp"
#include "engine/words.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

namespace rille::engine {

namespace {

const char* const place_form =
    "write X above FILM, X below FILM, X above|below FILM top|bottom, or middle of FILM";

bool ends_with(const std::string& text, const std::string& tail) {
    return text.size() > tail.size() &&
           text.compare(text.size() - tail.size(), tail.size(), tail) == 0;
}

struct PlaceReader {
    const Entry& entry;
    const Case& result;
    Problems& problems;

    void wrong(const std::string& message) { problems.add(entry.at, entry.path, message); }

    const geometry::Film* film(const std::string& name) {
        const int index = film_index(result, name);
        if (index >= 0) return &result.films[index];
        const std::vector<std::string> names = film_names(result);
        wrong(fmt::format("no film is called {}; there are: {}{}", quoted(name), listed(names, 8),
                          did_you_mean(name, names)));
        return nullptr;
    }

    std::optional<double> bottom(const geometry::Film& film) {
        if (std::isfinite(film.bottom)) return film.bottom;
        wrong(fmt::format("{} is semi-infinite: it has no bottom", quoted(film.name)));
        return std::nullopt;
    }

    /// "gate top", "gate bottom" or "gate", which is its top from above and its bottom from below.
    std::optional<double> interface(const std::string& text, bool above) {
        bool at_top = above;
        std::string name = text;
        if (film_index(result, text) < 0 && ends_with(text, " top")) {
            at_top = true;
            name = text.substr(0, text.size() - 4);
        } else if (film_index(result, text) < 0 && ends_with(text, " bottom")) {
            at_top = false;
            name = text.substr(0, text.size() - 7);
        }
        const geometry::Film* found = film(name);
        if (!found) return std::nullopt;
        return at_top ? found->top : bottom(*found);
    }

    std::optional<double> middle() {
        if (entry.text.rfind("middle of ", 0) != 0) {
            wrong(fmt::format("{}: middle of what? Write middle of FILM", quoted(entry.text)));
            return std::nullopt;
        }
        const geometry::Film* found = film(trimmed(entry.text.substr(10)));
        if (!found) return std::nullopt;
        const std::optional<double> low = bottom(*found);
        if (!low) return std::nullopt;
        return 0.5 * (found->top + *low);
    }

    std::optional<double> read() {
        const std::string& text = entry.text;
        if (text.rfind("middle", 0) == 0) return middle();
        const std::size_t above = text.find(" above "), below = text.find(" below ");
        if (above == std::string::npos && below == std::string::npos) {
            if (ends_with(text, " top") || ends_with(text, " bottom")) return interface(text, true);
            wrong(fmt::format("{} is not a place; {}", quoted(text), place_form));
            return std::nullopt;
        }
        const bool is_above = above < below;
        const std::size_t cut = std::min(above, below);
        const QuantityText offset = parse_quantity(text.substr(0, cut), Dimension::length);
        if (!offset.error.empty()) {
            wrong(offset.error);
            return std::nullopt;
        }
        const std::optional<double> base = interface(trimmed(text.substr(cut + 7)), is_above);
        if (!base) return std::nullopt;
        return is_above ? *base + offset.value : *base - offset.value;
    }
};

Entry written_place(const Rule& rule, const std::string& text) {
    Entry entry;
    entry.rule = &rule;
    entry.is_good = true;
    entry.text = text;
    return entry;
}

Entry* member_of(Entry& entry, const std::string& key) {
    for (auto& [name, value] : entry.members)
        if (name == key) return &value;
    return nullptr;
}

/// Three heights in the first film of the stack, a tenth of it from its ends but at most 10 nm.
void add_default_places(Entry& places, const Case& result) {
    if (result.films.size() <= static_cast<std::size_t>(result.substrate_first)) return;
    const geometry::Film& film = result.films[result.substrate_first];
    if (!std::isfinite(film.bottom)) return;
    const double inset = std::min(10.0, 0.1 * (film.top - film.bottom));
    const std::string length = format_quantity(inset, Dimension::length);
    const Rule& rule = places.rule->members[0];
    const auto add = [&](const char* label, const std::string& text) {
        places.members.emplace_back(label, written_place(rule, text));
    };
    add("top", fmt::format("{} below {} top", length, film.name));
    add("middle", fmt::format("middle of {}", film.name));
    add("bottom", fmt::format("{} above {} bottom", length, film.name));
}

std::vector<MetricName> names_with(const std::vector<std::string>& labels, const Case& c) {
    const Dimension length = Dimension::length, angle = Dimension::angle;
    const bool is_full = !c.domain.extruded(); // holes are measured in y and by area
    std::vector<MetricName> list;
    for (const std::string& label : labels) {
        for (const char* kind : {" cd", " cd_change"})
            list.push_back({label + kind, length});
        if (!is_full) list.push_back({label + " cd_loss", length});
        for (const char* kind : {" cd y", " cd area"})
            if (is_full) list.push_back({label + kind, length});
    }
    for (const char* name : {"bow", "bow cd", "bow depth", "depth centre", "depth edge",
                             "microtrench depth", "undercut", "mask left"})
        list.push_back({name, length});
    for (const char* name : {"sidewall angle left", "sidewall angle right", "facet angle"})
        list.push_back({name, angle});
    list.push_back({"selectivity", std::nullopt});
    if (const auto& contour = c.measured.contour) {
        const bool several = contour->cut_most > contour->cut_least;
        for (const double cut : {contour->cut_least, contour->cut_most})
            list.push_back({contour_metric(cut, several), length});
    }
    for (const MeasuredCd& cd : c.measured.cds)
        list.push_back({cd.place + " cd difference", length});
    for (const geometry::Film& film : c.films)
        if (film.name != "mask") list.push_back({film.name + " loss", length});
    return list;
}

struct TargetReader {
    const Entry& entry;
    const std::string& metric; ///< as written; "NAME of OPENING" where there are several
    const std::vector<MetricName>& known;
    const std::vector<std::string>& openings;
    Problems& problems;

    void wrong(const std::string& message) { problems.add(entry.at, entry.path, message); }

    /// What the target is about; nullptr and a problem if there is no such quantity.
    const MetricName* quantity() {
        std::string name = metric;
        const std::size_t of = metric.rfind(" of ");
        if (of != std::string::npos) {
            const std::string opening = metric.substr(of + 4);
            name = metric.substr(0, of);
            if (std::find(openings.begin(), openings.end(), opening) == openings.end()) {
                wrong(fmt::format("no opening is called {}; there are: {}{}", quoted(opening),
                                  listed(openings, 8), did_you_mean(opening, openings)));
                return nullptr;
            }
        }
        std::vector<std::string> names;
        for (const MetricName& one : known) {
            if (one.name == name) return &one;
            names.push_back(one.name);
        }
        wrong(fmt::format("no quantity is called {}; there are: {}{}", quoted(name),
                          listed(names, 24), did_you_mean(name, names)));
        return nullptr;
    }

    std::optional<double> value(const std::string& text, std::optional<Dimension> dimension) {
        std::string error;
        double result = 0;
        if (dimension) {
            const QuantityText read = parse_quantity(text, *dimension);
            error = read.error;
            result = read.value;
        } else {
            const NumberText read = split_number(text);
            error = read.error;
            if (error.empty() && !read.unit.empty())
                error = quoted(text) + ": a number without a unit is due";
            result = read.value;
        }
        if (error.empty()) return result;
        wrong(error);
        return std::nullopt;
    }

    Target read() {
        Target target;
        target.metric = metric;
        target.text = entry.text;
        const MetricName* measured = quantity();
        if (!measured) return target;
        const std::optional<Dimension> due = measured->dimension;
        const std::string& text = entry.text;
        const std::size_t to = text.find(" to ");
        if (text.rfind("at least ", 0) == 0) {
            target.at_least = value(text.substr(9), due);
        } else if (text.rfind("at most ", 0) == 0) {
            target.at_most = value(text.substr(8), due);
        } else if (to != std::string::npos) {
            read_range(text.substr(0, to), trimmed(text.substr(to + 4)), due, target);
        } else {
            const bool sign = text.find_first_of("<>=") != std::string::npos;
            wrong(fmt::format("{} is not a goal; write at least X, at most X, or X to Y{}",
                              quoted(text), sign ? " (signs such as >= are not read)" : ""));
        }
        return target;
    }

    /// "55 to 65 nm": the unit of the upper end holds for the lower one too.
    void read_range(std::string low, const std::string& high, std::optional<Dimension> due,
                    Target& target) {
        const NumberText first = split_number(low), last = split_number(high);
        if (first.error.empty() && first.unit.empty() && last.error.empty()) low += " " + last.unit;
        target.at_most = value(high, due);
        if (!target.at_most) return;
        target.at_least = value(low, due);
        if (target.at_least && *target.at_least > *target.at_most)
            wrong(fmt::format("{}: the first value is the smaller one", quoted(entry.text)));
    }
};

} // namespace

void build_measure(Entry& root, Case& result, Problems& problems) {
    Entry* measure = member_of(root, "measure");
    Entry* places = measure ? member_of(*measure, "cd") : nullptr;
    if (!places || !places->is_good) return;
    if (!places->is_given && problems.empty()) add_default_places(*places, result);
    for (const auto& [label, entry] : places->members) {
        if (!entry.is_good || result.films.empty()) continue;
        const std::optional<double> z = PlaceReader{entry, result, problems}.read();
        if (!z) continue;
        const double top = result.mask.thickness + result.liner_thickness;
        if (*z >= top && !result.mask.openings.empty())
            problems.add(entry.at, entry.path,
                         fmt::format("{} is above the mask, which ends {:.4g} nm above the stack: "
                                     "there is no CD",
                                     quoted(entry.text), top));
        result.cd_places[label] = {entry.text, *z};
    }
}

std::vector<MetricName> metric_names(const Case& c) {
    std::vector<std::string> labels;
    for (const auto& [label, place] : c.cd_places)
        labels.push_back(label);
    return names_with(labels, c);
}

void build_targets(const Entry& root, Case& result, Problems& problems) {
    std::vector<std::string> labels; // also of heights that are wrong, which is said already
    for (const auto& [label, entry] : root["measure"]["cd"].members)
        labels.push_back(label);
    const std::vector<MetricName> known = names_with(labels, result);
    const std::vector<std::string> openings = opening_names(result);
    for (const auto& [metric, entry] : root["targets"].members)
        if (entry.is_good)
            result.targets.push_back(TargetReader{entry, metric, known, openings, problems}.read());
    for (const auto& [key, entry] : root["tool_log"].members) {
        const YamlNode& raw = entry.raw;
        result.tool_log.push_back(key + ": " + (raw.is_scalar() ? raw.text : what_it_is(raw)));
    }
}

} // namespace rille::engine
