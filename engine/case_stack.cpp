// SPDX-License-Identifier: Apache-2.0
#include "engine/case_build.hpp"

#include "engine/words.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <limits>

namespace rille::engine {

namespace {

/// Spacing that a search for an accuracy starts with: the narrowest opening is 16 cells wide.
double first_spacing(const Entry& root, double width_x) {
    constexpr double cells_across = 16;
    double narrowest = width_x;
    for (const Entry& opening : root["mask"]["openings"].items)
        for (const double width : opening["cd"].numbers.empty()
                                      ? std::vector<double>{opening["cd"].number}
                                      : opening["cd"].numbers)
            if (width > 0) narrowest = std::min(narrowest, width);
    return narrowest / cells_across;
}

/// The spacing as it is given, or under `accuracy` the one to start with. False: neither is there.
bool asked_spacing(const Entry& root, Case& result, Entry& spacing, Problems& problems) {
    const Entry& accuracy = root["accuracy"];
    if (accuracy.is_given == root["spacing"].is_given) {
        problems.add(accuracy.is_given ? accuracy.at : root.at, "",
                     accuracy.is_given
                         ? "accuracy chooses the spacing; give one of the two"
                         : "a case needs a spacing: spacing: 1 nm, or the error that CDs may have: "
                           "accuracy: {cd: 0.5 nm}");
        return false;
    }
    if (!accuracy.is_given) {
        spacing = root["spacing"];
        return spacing.is_good;
    }
    if (!accuracy["cd"].is_good) return false;
    result.accuracy_cd_nm = accuracy["cd"].number;
    spacing = accuracy["spacing"];
    if (spacing.is_given) return spacing.is_good;
    spacing.at = accuracy.at;
    spacing.path = accuracy.path;
    spacing.number = first_spacing(root, root["pitch"].numbers[0]);
    spacing.text = format_quantity(spacing.number, Dimension::length);
    return true;
}

void build_cells(const Entry& pitch, const Entry& spacing, Case& result, Problems& problems) {
    geometry::Domain& domain = result.domain;
    const double width_x = pitch.numbers[0];
    const double width_y = pitch.numbers.size() > 1 ? pitch.numbers[1] : width_x;
    const double asked = spacing.number;
    result.spacing_asked = asked;
    if (asked > width_x || (!domain.planar_contour() && asked > width_y)) {
        problems.add(
            spacing.at, spacing.path,
            fmt::format("{} is wider than the pitch {}", quoted(spacing.text), pitch.text));
        return;
    }
    const double across = domain.revolved() ? 0.5 * width_x : width_x;
    const int cells = domain.planar_contour()
                          ? std::max(1, static_cast<int>(std::lround(across / asked)))
                          : common_cells(width_x, width_y, asked);
    if (cells == 0) {
        const double rows = std::max(1.0, std::round(width_y / asked));
        problems.add(pitch.at, pitch.path,
                     fmt::format("{} has no common spacing within 20 % of {}; with {} along y "
                                 "there is one",
                                 pitch.text, spacing.text,
                                 format_quantity(rows * width_x / std::round(width_x / asked),
                                                 Dimension::length)));
        return;
    }
    domain.cells_x = cells;
    domain.spacing = across / cells;
    domain.cells_y =
        domain.planar_contour() ? 1 : static_cast<int>(std::lround(width_y / domain.spacing));
    if (std::abs(domain.spacing - asked) > 1e-9 * asked && result.accuracy_cd_nm <= 0)
        result.warnings.push_back(fmt::format("spacing {:.6g} nm instead of {}: {} cells fill the "
                                              "{}",
                                              domain.spacing, spacing.text, cells,
                                              domain.revolved() ? "radius" : "pitch"));
}

struct StackBuilder {
    Case& result;
    Problems& problems;
    double top = 0;
    bool ended = false; ///< a semi-infinite film was met

    void add(const Entry& film, const std::string& name) {
        const Entry& thickness = film["thickness"];
        if (ended)
            problems.add(film.at, film.path,
                         "lies below a semi-infinite film; semi-infinite is "
                         "for the last film of the stack");
        if (film_index(result, name) >= 0 && film["name"].is_good &&
            !problems.any_at(film["name"].at))
            problems.add(film["name"].at, film["name"].path,
                         fmt::format("the name {} is used twice", quoted(name)));
        if (name == "mask" || name == "liner")
            problems.add(
                film["name"].at, film["name"].path,
                fmt::format("{} is the name of the {} itself; choose another", quoted(name), name));
        geometry::Film made;
        made.name = name;
        made.material = material_index(result, film["material"]);
        made.top = top;
        made.bottom = bottom_of(thickness);
        top = made.bottom;
        result.films.push_back(made);
    }

    double bottom_of(const Entry& thickness) {
        constexpr double nowhere = -std::numeric_limits<double>::infinity();
        if (!thickness.is_good) return top - 1;
        if (thickness.text == "semi-infinite") {
            ended = true;
            return nowhere;
        }
        const QuantityText value = parse_quantity(thickness.text, Dimension::length);
        if (!value.error.empty())
            problems.add(thickness.at, thickness.path, value.error + ", or semi-infinite");
        else if (!(value.value > 0))
            problems.add(thickness.at, thickness.path,
                         fmt::format("{} is out of range; allowed is more than 0 nm",
                                     quoted(thickness.text)));
        else
            return top - value.value;
        return top - 1; // already reported; keeps the films apart for the checks that follow
    }
};

} // namespace

int common_cells(double width_x, double width_y, double asked) {
    const int near = std::max(1, static_cast<int>(std::lround(width_x / asked)));
    for (int off = 0; off <= std::max(1, near / 5); ++off)
        for (const int cells : {near + off, near - off}) {
            if (cells < 1) continue;
            const double rows = width_y * cells / width_x;
            if (rows > 0.5 && std::abs(rows - std::round(rows)) < 1e-9 * rows) return cells;
        }
    return 0;
}

int material_index(Case& result, const Entry& name) {
    auto& list = result.materials;
    if (!name.is_good) return 0;
    const auto found = std::find(list.begin(), list.end(), name.text);
    if (found != list.end()) return static_cast<int>(found - list.begin());
    list.push_back(name.text);
    return static_cast<int>(list.size()) - 1;
}

int film_index(const Case& result, const std::string& name) {
    for (std::size_t f = 0; f < result.films.size(); ++f)
        if (result.films[f].name == name) return static_cast<int>(f);
    return -1;
}

std::vector<std::string> film_names(const Case& result) {
    std::vector<std::string> names;
    for (const geometry::Film& film : result.films)
        names.push_back(film.name);
    return names;
}

void build_domain(const Entry& root, Case& result, Problems& problems) {
    result.title = root["title"].text;
    const Entry& symmetry = root["symmetry"];
    const Entry& pitch = root["pitch"];
    result.domain.symmetry = symmetry.text == "full"       ? geometry::Symmetry::full
                             : symmetry.text == "revolved" ? geometry::Symmetry::revolved
                                                           : geometry::Symmetry::extruded;
    result.domain.sides =
        root["sides"].text == "periodic" ? geometry::Sides::periodic : geometry::Sides::mirror;
    if (!symmetry.is_good || !pitch.is_good) return;
    if (result.domain.planar_contour() && pitch.numbers.size() > 1) {
        problems.add(pitch.at, pitch.path,
                     fmt::format("{} has one pitch; [x, y] is for symmetry: full", symmetry.text));
        return;
    }
    if (result.domain.revolved() && result.domain.sides == geometry::Sides::periodic)
        problems.add(root["sides"].at, root["sides"].path,
                     "a round cell does not repeat: revolved has sides: mirror; holes side by "
                     "side need symmetry: full");
    result.assess_grid_error = root["grid_error"].text == "assessed";
    Entry spacing;
    if (asked_spacing(root, result, spacing, problems))
        build_cells(pitch, spacing, result, problems);
}

void build_stack(const Entry& root, Case& result, Problems& problems) {
    StackBuilder builder{result, problems};
    const Entry& mask = root["mask"];
    if (mask.is_given) {
        geometry::Film film;
        film.name = "mask";
        film.material = material_index(result, mask["material"]);
        film.top = mask["thickness"].is_good ? mask["thickness"].number : 1;
        film.bottom = 0;
        result.films.push_back(film);
        result.mask_material = mask["material"].text;
    }
    result.substrate_first = static_cast<int>(result.films.size());
    for (const Entry& item : root["stack"].items) {
        if (!item["repeat"].is_given) {
            builder.add(item, item["name"].text);
            continue;
        }
        for (int n = 1; n <= static_cast<int>(item["repeat"].number); ++n)
            for (const Entry& film : item["films"].items)
                builder.add(film, fmt::format("{} {} {}", item["name"].text, n, film["name"].text));
    }
    const Entry& stack = root["stack"];
    if (stack.is_good && !stack.items.empty() && !builder.ended)
        problems.add(stack.items.back().at, stack.items.back().path,
                     "the last film of the stack needs thickness: semi-infinite");
    if (root["liner"].is_given) {
        result.liner_thickness = root["liner"]["thickness"].number;
        result.liner_material = material_index(result, root["liner"]["material"]);
    }
}

} // namespace rille::engine
