// SPDX-License-Identifier: Apache-2.0
#include "engine/case_build.hpp"

#include "engine/words.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

namespace rille::engine {

namespace {

using geometry::Opening;

constexpr double rad_per_deg = 3.14159265358979323846 / 180.0;

struct MaskBuilder {
    Case& result;
    Problems& problems;
    double widening = 0; ///< full width at the mask top less that at the bottom [nm]

    double period_x() const {
        return result.domain.revolved() ? 2 * result.domain.width_x() : result.domain.width_x();
    }
    double period_y() const {
        if (result.domain.revolved()) return period_x();
        return result.domain.extruded() ? 0 : result.domain.width_y();
    }

    void add(const Entry& item) {
        const Entry& cd = item["cd"];
        const std::string shape = item["shape"].text;
        if (result.domain.extruded() && (shape == "round" || shape == "elliptic")) {
            problems.add(item["shape"].at, item["shape"].path,
                         fmt::format("{} holes need symmetry: {}; extruded has trench or lines",
                                     shape, shape == "round" ? "revolved or full" : "full"));
            return;
        }
        if (result.domain.revolved() && !suits_round_cell(item, shape)) return;
        if (!cd.is_good || !item["centre"].is_good) return;
        Opening opening;
        opening.name = item["name"].text;
        opening.shape = shape == "round"      ? Opening::Shape::round
                        : shape == "elliptic" ? Opening::Shape::elliptic
                                              : Opening::Shape::trench;
        const double extra = item["cd_at"].text == "mask top" ? widening : 0;
        const bool is_pair = shape == "elliptic";
        opening.width_x = (is_pair ? cd.numbers[0] : cd.number) - extra;
        opening.width_y = opening.shape == Opening::Shape::trench ? 0
                          : is_pair                               ? cd.numbers[1] - extra
                                                                  : opening.width_x;
        const std::vector<double>& centre = item["centre"].numbers;
        opening.centre_x = centre[0];
        opening.centre_y = centre.size() > 1 ? centre[1] : 0;
        check_name(item["name"]);
        if (shape == "lines")
            add_array(item, opening);
        else
            add_one(item, opening);
    }

    /// Revolved: one round hole, on the axis.
    bool suits_round_cell(const Entry& item, const std::string& shape) {
        const std::vector<double>& centre = item["centre"].numbers;
        const bool off = item["centre"].is_good &&
                         std::any_of(centre.begin(), centre.end(), [](double c) { return c != 0; });
        if (shape != "round")
            problems.add(item["shape"].at, item["shape"].path,
                         shape == "elliptic"
                             ? "an elliptic hole needs symmetry: full; revolved has one round hole"
                             : fmt::format("{} needs symmetry: extruded or full; revolved has one "
                                           "round hole",
                                           shape));
        else if (off)
            problems.add(item["centre"].at, item["centre"].path,
                         "revolved has its hole on the axis; off it needs symmetry: full");
        else if (!result.mask.openings.empty())
            problems.add(item.at, item.path, "revolved has one hole; several need symmetry: full");
        else
            return true;
        return false;
    }

    void check_name(const Entry& name) {
        if (name.text == "open field" || name.text == "mask")
            problems.add(
                name.at, name.path,
                fmt::format("{} has a meaning of its own; choose another name", quoted(name.text)));
    }

    void add_array(const Entry& item, const Opening& first) {
        if (!item["space"].is_good || !item["count"].is_good) return;
        const int count = static_cast<int>(item["count"].number);
        // cd and space are both measured at cd_at: their sum does not depend on the height.
        const double step = item["cd"].number + item["space"].number;
        for (int n = 0; n < count; ++n) {
            Opening opening = first;
            opening.name = count > 1 ? fmt::format("{} {}", first.name, n + 1) : first.name;
            opening.centre_x = first.centre_x + (n - 0.5 * (count - 1)) * step;
            if (!add_one(item, opening)) return;
        }
    }

    bool add_one(const Entry& item, const Opening& opening) {
        const double least =
            std::min(opening.width_x, opening.width_y > 0 ? opening.width_y : opening.width_x);
        if (!(least > 0) || !(least + widening > 0)) {
            problems.add(item["cd"].at, item["cd"].path,
                         fmt::format("with this thickness and sidewall angle the opening closes "
                                     "inside the mask ({:.4g} nm wide at its bottom, {:.4g} nm at "
                                     "its top)",
                                     least, least + widening));
            return false;
        }
        const bool fits_x = fits(opening.centre_x, opening.width_x, period_x());
        const bool fits_y = opening.shape == Opening::Shape::trench ||
                            fits(opening.centre_y, opening.width_y, period_y());
        if (result.domain.cells_x > 1 && !(fits_x && fits_y)) {
            problems.add(item.at, item.path,
                         fmt::format("does not fit into the period: {:.4g} nm wide at its widest, "
                                     "centre at {:.4g} nm; {}",
                                     widest(opening.width_x), opening.centre_x,
                                     result.domain.sides == geometry::Sides::mirror
                                         ? "at a mirror side it may end, or have its centre"
                                         : "the pitch must be wider"));
            return false;
        }
        check_cells(item, opening.name, least);
        result.mask.openings.push_back(opening);
        return true;
    }

    double widest(double width) const { return width + std::max(0.0, widening); }

    /// Within the period, or (mirror) centred on one of its sides, or (periodic) anywhere.
    bool fits(double centre, double width, double period) const {
        const double half = 0.5 * period, reach = 0.5 * widest(width);
        const double slack = 1e-9 * period;
        if (std::abs(centre) > half + slack || reach > half + slack) return false;
        if (result.domain.sides == geometry::Sides::periodic) return true;
        return std::abs(centre) + reach <= half + slack ||
               std::abs(std::abs(centre) - half) <= slack;
    }

    /// An opening of fewer than three cells has no shape; one of fewer than eight no accurate CD.
    void check_cells(const Entry& item, const std::string& name, double width) {
        if (result.domain.cells_x < 1) return;
        const double cells = width / result.domain.spacing;
        if (cells < 3)
            problems.add(item.at, item.path,
                         fmt::format("{:.4g} nm are {:.2g} cells of {:.4g} nm: too few for any "
                                     "shape; 10 or more resolve a CD, spacing: {:.3g} nm",
                                     width, cells, result.domain.spacing, width / 10));
        else if (cells < 8)
            result.warnings.push_back(fmt::format("opening {} is only {:.3g} cells wide; 10 or "
                                                  "more resolve its CD",
                                                  name, cells));
    }

    /// Openings must leave some mask between them, at its bottom and at its top.
    void check_gaps(const Entry& openings) {
        const auto& all = result.mask.openings;
        for (std::size_t a = 0; a < all.size(); ++a)
            for (std::size_t b = a + 1; b < all.size(); ++b)
                if (overlap(all[a], all[b])) {
                    problems.add(openings.at, openings.path,
                                 fmt::format("{} and {} touch or overlap", quoted(all[a].name),
                                             quoted(all[b].name)));
                    return;
                }
    }

    bool overlap(const Opening& a, const Opening& b) const {
        const double x = apart(a.centre_x, b.centre_x, period_x());
        const double reach_x = 0.5 * (widest(a.width_x) + widest(b.width_x));
        if (a.shape == Opening::Shape::trench || b.shape == Opening::Shape::trench)
            return x < reach_x * (1 - 1e-9);
        const double y = apart(a.centre_y, b.centre_y, period_y());
        const double reach_y = 0.5 * (widest(a.width_y) + widest(b.width_y));
        return std::hypot(x / reach_x, y / reach_y) < 1 - 1e-9;
    }

    double apart(double a, double b, double period) const {
        const double plain = std::abs(a - b);
        if (result.domain.sides == geometry::Sides::mirror || period <= 0) return plain;
        return std::min(plain, std::abs(period - plain));
    }
};

} // namespace

std::vector<std::string> opening_names(const Case& result) {
    std::vector<std::string> names;
    for (const Opening& opening : result.mask.openings)
        names.push_back(opening.name);
    return names;
}

void build_mask(const Entry& root, Case& result, Problems& problems) {
    const Entry& mask = root["mask"];
    if (!mask.is_given || !mask.is_good) return;
    result.mask.thickness = mask["thickness"].number;
    result.mask.sidewall_angle_deg =
        mask["sidewall_angle"].is_good ? mask["sidewall_angle"].number : 90;
    result.mask.corner_radius = mask["corner_radius"].number;
    if (mask["corner_radius"].is_good && mask["thickness"].is_good &&
        result.mask.corner_radius > result.mask.thickness)
        problems.add(mask["corner_radius"].at, mask["corner_radius"].path,
                     fmt::format("{} is more than the thickness {} of the mask",
                                 quoted(mask["corner_radius"].text), mask["thickness"].text));
    MaskBuilder builder{result, problems};
    builder.widening =
        2 * result.mask.thickness / std::tan(result.mask.sidewall_angle_deg * rad_per_deg);
    if (std::abs(result.mask.sidewall_angle_deg - 90) < 1e-12) builder.widening = 0;
    const std::size_t before = problems.size();
    for (const Entry& item : mask["openings"].items)
        builder.add(item);
    if (problems.size() == before) builder.check_gaps(mask["openings"]);
}

} // namespace rille::engine
