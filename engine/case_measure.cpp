// SPDX-License-Identifier: Apache-2.0
#include "engine/case_build.hpp"

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

} // namespace rille::engine
