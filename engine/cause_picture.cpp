// SPDX-License-Identifier: Apache-2.0
#include "engine/cause_output.hpp"

#include "engine/cause_bands.hpp"
#include "engine/causes.hpp"
#include "engine/number_text.hpp"
#include "engine/picture_parts.hpp"
#include "engine/run_record.hpp"

#include <algorithm>
#include <cmath>
#include <cstring>
#include <fmt/format.h>

namespace rille::engine {
namespace {

constexpr double margin = 28, head = 96, foot = 44, axis_room = 62;
constexpr double wall_width = 250, floor_height = 150, tallest = 560, widest = 460, narrowest = 180;
constexpr double legend_width = 210;

TextStyle small(Anchor anchor, double rotate = 0) {
    return {10.5, anchor, false, "#222222", false, rotate};
}

/// Pieces of the walk that belong to the first opening, from the top of its left wall to the top of
/// its right wall.
struct FeatureWalk {
    std::vector<std::size_t> left, floor, right; ///< indices into the walk, in walking order
};

bool is_in(const Case& c, const SurfaceState& state, const SectionWalk& walk, std::size_t i,
           const char* region) {
    return std::strcmp(region_of(c, state.surface, walk.element[i], walk.is_image[i]), region) == 0;
}

FeatureWalk feature_of(const Case& c, const SurfaceState& state, const SectionWalk& walk) {
    FeatureWalk feature;
    if (walk.element.empty()) return feature;
    const double axis = c.mask.openings.empty() ? 0 : c.mask.openings.front().centre_x;
    std::size_t middle = 0;
    for (std::size_t i = 0; i < walk.element.size(); ++i)
        if (std::fabs(walk.middle[i][0] - axis) < std::fabs(walk.middle[middle][0] - axis))
            middle = i;
    std::size_t first = middle, last = middle;
    const auto is_top = [&](std::size_t i) { return is_in(c, state, walk, i, "top"); };
    while (first > 0 && !is_top(first - 1))
        --first;
    while (last + 1 < walk.element.size() && !is_top(last + 1))
        ++last;
    for (std::size_t i = first; i <= last; ++i) {
        if (is_in(c, state, walk, i, "left wall")) feature.left.push_back(i);
        if (is_in(c, state, walk, i, "right wall")) feature.right.push_back(i);
        if (is_in(c, state, walk, i, "floor")) feature.floor.push_back(i);
    }
    return feature;
}

fluxes::CauseFields bands_of(const SurfaceState& state, const SectionWalk& walk,
                             const std::vector<std::size_t>& pieces) {
    fluxes::CauseFields bands(fluxes::cause_count);
    for (std::size_t k = 0; k < bands.size(); ++k)
        for (const std::size_t i : pieces)
            bands[k].push_back(state.removed[k][walk.element[i]]);
    return bands;
}

/// A range that the few largest values, at edges, do not decide.
AxisScale common_scale(const std::vector<const fluxes::CauseFields*>& all) {
    std::vector<double> high, low;
    for (const fluxes::CauseFields* bands : all)
        for (std::size_t i = 0; i < bands->front().size(); ++i) {
            double above = 0, below = 0;
            for (const auto& band : *bands) {
                above += std::max(band[i], 0.0);
                below += std::min(band[i], 0.0);
            }
            high.push_back(above);
            low.push_back(below);
        }
    AxisScale scale{0, 1, false};
    if (high.empty()) return scale;
    std::sort(high.begin(), high.end());
    std::sort(low.begin(), low.end());
    const std::size_t few = high.size() / 33;
    scale.high = 1.12 * high[high.size() - 1 - few];
    scale.low = 1.12 * low[few];
    if (!(scale.high - scale.low > 1e-6)) scale.high = 1;
    return scale;
}

View feature_view(const Case& c, const Section& section) {
    View v;
    v.x_min = c.domain.revolved() ? -c.domain.x_max() : c.domain.x_min();
    v.x_max = c.domain.x_max();
    double low = 0, high = 0;
    for (const SectionLine& line : section)
        for (const auto& point : line.points) {
            low = std::min(low, point[1]);
            high = std::max(high, point[1]);
        }
    const double extent = std::max(high - low, 0.2 * (v.x_max - v.x_min));
    v.z_low = low - 0.08 * extent;
    v.z_high = high + 0.05 * extent;
    v.scale_x = v.scale_z = std::min(tallest / (v.z_high - v.z_low), widest / (v.x_max - v.x_min));
    if (v.width() < 0.7 * narrowest) v.scale_x *= std::ceil(narrowest / v.width() - 1e-9);
    v.left = margin + axis_room + wall_width + 24;
    v.top = head;
    return v;
}

class Picture {
public:
    Picture(const Case& c, const SurfaceState& state)
        : c_(c), state_(state), section_(vertical_section(c.domain, state.surface, section_y(c))),
          walk_(longest_walk(section_)), feature_(feature_of(c, state, walk_)),
          left_(bands_of(state, walk_, feature_.left)),
          right_(bands_of(state, walk_, feature_.right)),
          floor_(bands_of(state, walk_, feature_.floor)), v_(feature_view(c, section_)),
          svg_(v_.right() + 24 + wall_width + axis_room + legend_width + margin,
               v_.bottom() + 78 + floor_height + 46 + foot, c.title + ": what made the shape") {}

    std::string draw() {
        draw_profile();
        const AxisScale scale = common_scale({&left_, &right_});
        const double room = v_.right() + 24;
        draw_wall("Left wall", left_, feature_.left, scale, v_.left - 24, -1);
        draw_wall("Right wall", right_, feature_.right, scale, room, 1);
        draw_floor();
        draw_legend(room + wall_width + axis_room);
        draw_words();
        return svg_.finish();
    }

private:
    void draw_profile() {
        const Metrics no_metrics;
        const std::vector<PictureFront> no_fronts;
        const PictureContext p{c_,       no_fronts,  state_,
                               section_, no_metrics, material_looks(c_.materials)};
        for (std::size_t m = 0; m < p.looks.size(); ++m)
            svg_.define(hatch_pattern("hatch" + std::to_string(m), p.looks[m]));
        svg_.define(cause_hatch());
        draw_section(svg_, v_, p);
        const bool stretched = std::fabs(v_.scale_x / v_.scale_z - 1) > 1e-9;
        if (stretched)
            svg_.text(
                v_.left + 0.5 * v_.width(), v_.bottom() + 16,
                fmt::format("widths {:.0f} times the scale of depths", v_.scale_x / v_.scale_z),
                {10.5, Anchor::middle, true, "#7a1f5c", false, 0});
    }

    /// `sense` -1: values grow to the left from x0, 1: to the right.
    void draw_wall(const std::string& name, const fluxes::CauseFields& bands,
                   const std::vector<std::size_t>& pieces, const AxisScale& scale, double x0,
                   double sense) {
        const double outer = x0 + sense * wall_width, left = std::min(x0, outer);
        const auto x_of = [&](double value) { return x0 + sense * wall_width * scale.part(value); };
        const std::string id = sense < 0 ? "wallclipleft" : "wallclipright";
        svg_.define(fmt::format("<clipPath id=\"{}\"><rect x=\"{}\" y=\"{}\" width=\"{}\" "
                                "height=\"{}\"/></clipPath>",
                                id, px(left), px(v_.top), px(wall_width), px(v_.height())));
        for (const double tick : scale.ticks(4)) {
            svg_.line(x_of(tick), v_.top, x_of(tick), v_.bottom(),
                      "stroke=\"#e2e2e2\" stroke-width=\"0.8\"");
            svg_.text(x_of(tick), v_.bottom() + 15, fmt::format("{:.4g}", tick),
                      small(Anchor::middle));
        }
        if (!pieces.empty()) {
            svg_.raw("<g clip-path=\"url(#" + id + ")\">");
            draw_cause_bands(svg_, bands, [&](std::size_t i, double value) {
                return std::array<double, 2>{x_of(value), v_.y(walk_.middle[pieces[i]][1])};
            });
            svg_.raw("</g>");
        }
        svg_.line(x_of(0), v_.top, x_of(0), v_.bottom(), "stroke=\"#333333\" stroke-width=\"1\"");
        svg_.rect({left, v_.top, wall_width, v_.height()},
                  "fill=\"none\" stroke=\"#555555\" stroke-width=\"0.8\"");
        svg_.text(left + 0.5 * wall_width, v_.top - 8, name,
                  {12, Anchor::middle, true, "#222222", false, 0});
        svg_.text(left + 0.5 * wall_width, v_.bottom() + 33, "removed (nm)", small(Anchor::middle));
        const double step = round_length(60 / v_.scale_z * 1.4);
        for (double i = std::ceil(-v_.z_high / step); i * step <= -v_.z_low; ++i) {
            const double y = v_.y(-i * step);
            svg_.line(outer, y, outer + sense * 5, y, "stroke=\"#222222\" stroke-width=\"1\"");
            svg_.text(outer + sense * 8, y + 4, rounded(i * step, step >= 1 ? 20 : step),
                      small(sense < 0 ? Anchor::end : Anchor::start));
        }
        if (sense < 0)
            svg_.text(outer - 46, v_.top + 0.5 * v_.height(), "depth below the mask bottom (nm)",
                      small(Anchor::middle, -90));
    }

    void draw_floor() {
        const double top = v_.bottom() + 78;
        const AxisScale scale = common_scale({&floor_});
        const auto y_of = [&](double value) { return top + floor_height * scale.part(value); };
        for (const double tick : scale.ticks(4)) {
            svg_.line(v_.left, y_of(tick), v_.right(), y_of(tick),
                      "stroke=\"#e2e2e2\" stroke-width=\"0.8\"");
            svg_.text(v_.left - 6, y_of(tick) + 4, fmt::format("{:.4g}", tick), small(Anchor::end));
        }
        svg_.define(fmt::format("<clipPath id=\"floorclip\"><rect x=\"{}\" y=\"{}\" width=\"{}\" "
                                "height=\"{}\"/></clipPath>",
                                px(v_.left), px(top), px(v_.width()), px(floor_height)));
        if (!feature_.floor.empty()) {
            svg_.raw("<g clip-path=\"url(#floorclip)\">");
            draw_cause_bands(svg_, floor_, [&](std::size_t i, double value) {
                return std::array<double, 2>{v_.x(walk_.middle[feature_.floor[i]][0]), y_of(value)};
            });
            svg_.raw("</g>");
        }
        svg_.rect({v_.left, top, v_.width(), floor_height},
                  "fill=\"none\" stroke=\"#555555\" stroke-width=\"0.8\"");
        svg_.text(v_.left + 0.5 * v_.width(), top - 8, "Floor",
                  {12, Anchor::middle, true, "#222222", false, 0});
        svg_.text(v_.left - 44, top + 0.5 * floor_height, "removed (nm)",
                  small(Anchor::middle, -90));
        const AxisScale across{v_.x_min, v_.x_max, false};
        for (const double tick : across.ticks(4))
            svg_.text(v_.x(tick), top + floor_height + 15, fmt::format("{:.4g}", tick),
                      small(Anchor::middle));
        svg_.text(v_.left + 0.5 * v_.width(), top + floor_height + 32, "x (nm)",
                  small(Anchor::middle));
    }

    void draw_legend(double x) {
        fluxes::CauseFields all(fluxes::cause_count);
        double most = 0;
        for (const fluxes::CauseFields* bands : {&left_, &right_, &floor_}) {
            const auto range =
                bands->front().empty() ? std::array<double, 2>{} : band_range(*bands);
            for (std::size_t k = 0; k < all.size(); ++k) {
                double largest = 0; // as a share of what this part has lost
                for (const double value : (*bands)[k])
                    largest = std::max(largest, std::fabs(value));
                const double whole = range[1] - range[0];
                all[k].push_back(whole > 0 ? largest / whole : 0);
                most = std::max(most, all[k].back());
            }
        }
        svg_.text(x, v_.top + 4, "Causes", {12, Anchor::start, true, "#222222", false, 0});
        draw_cause_legend(svg_, all, 2e-3 * most, x, v_.top + 16);
    }

    void draw_words() {
        svg_.text(margin, 38, c_.title, {20, Anchor::start, true, "#111111", false, 0});
        svg_.text(margin, 60,
                  fmt::format("What made the shape: removed since the start by each cause, along "
                              "the way of the surface · after {}{}",
                              time_text(state_.time_s),
                              c_.domain.planar_contour()
                                  ? std::string()
                                  : " · section at y = " + rounded(section_y(c_), 20) + " nm"),
                  {12.5, Anchor::start, false, "#444444", false, 0});
        svg_.line(margin, svg_.height() - 30, svg_.width() - margin, svg_.height() - 30,
                  "stroke=\"#999999\" stroke-width=\"0.6\"");
        svg_.text(margin, svg_.height() - 13,
                  "model prediction, not a released recipe · " + standing_line(c_) +
                      " · numbers in causes.csv",
                  {10.5, Anchor::start, false, "#444444", false, 0});
    }

    const Case& c_;
    const SurfaceState& state_;
    Section section_;
    SectionWalk walk_;
    FeatureWalk feature_;
    fluxes::CauseFields left_, right_, floor_;
    View v_;
    Svg svg_;
};

} // namespace

std::string cause_picture_svg(const Case& c, const SurfaceState& state) {
    return Picture(c, state).draw();
}

} // namespace rille::engine
