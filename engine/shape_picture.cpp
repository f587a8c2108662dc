// SPDX-License-Identifier: Apache-2.0
#include "engine/shape_output.hpp"

#include "engine/case.hpp"
#include "engine/cause_bands.hpp"
#include "engine/causes.hpp"
#include "engine/number_text.hpp"
#include "engine/picture_parts.hpp"
#include "engine/run_record.hpp"

#include <algorithm>
#include <cmath>
#include <fmt/format.h>
#include <initializer_list>

namespace rille::engine {
namespace {

constexpr double margin = 28, head = 96, foot = 44, axis_room = 62;
constexpr double wall_width = 250, floor_height = 150, tallest = 560, widest = 460, narrowest = 180;
constexpr double legend_width = 210;
constexpr const char* way_style =
    "fill=\"none\" stroke=\"#000000\" stroke-width=\"1.2\" stroke-dasharray=\"4 2\"";

TextStyle small(Anchor anchor, double rotate = 0) {
    return {10.5, anchor, false, "#222222", false, rotate};
}

const ShapePart* part_of(const std::vector<ShapePart>& parts,
                         std::initializer_list<ShapePart::Face> faces) {
    for (const ShapePart& part : parts)
        if (part.opening == 0 && std::count(faces.begin(), faces.end(), part.face) > 0)
            return &part;
    return nullptr;
}

/// Amounts of one face of the opening.
struct Bands {
    const ShapePart* part = nullptr; ///< null where there is no such face
    fluxes::CauseFields causes{fluxes::cause_count};

    explicit Bands(const ShapePart* of) : part(of) {
        for (std::size_t k = 0; part && k < causes.size(); ++k)
            for (const ShapePart::Place& place : part->places)
                causes[k].push_back(place.removed[k]);
    }
};

/// A range that the few largest values, at edges, do not decide.
AxisScale common_scale(std::initializer_list<const Bands*> all) {
    std::vector<double> high, low;
    for (const Bands* bands : all)
        for (std::size_t i = 0; i < bands->causes.front().size(); ++i) {
            double above = 0, below = 0;
            for (const auto& band : bands->causes) {
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
    View v = view_of(c, section, 0.08, 0.05, widest, tallest);
    if (v.width() < 0.7 * narrowest) v.scale_x *= std::ceil(narrowest / v.width() - 1e-9);
    v.left = margin + axis_room + wall_width + 24;
    v.top = head;
    return v;
}

class Picture {
public:
    Picture(const Case& c, const SurfaceState& state, const std::vector<ShapePart>& parts)
        : c_(c), state_(state), section_(vertical_section(c.domain, state.surface, section_y(c))),
          left_(part_of(parts, {ShapePart::Face::left_wall})),
          right_(part_of(parts, {ShapePart::Face::right_wall, ShapePart::Face::wall})),
          floor_(part_of(parts, {ShapePart::Face::floor})), v_(feature_view(c, section_)),
          svg_(v_.right() + 24 + wall_width + axis_room + legend_width + margin,
               v_.bottom() + 78 + floor_height + 46 + foot, c.title + ": what made the shape") {}

    std::string draw() {
        draw_profile();
        const AxisScale scale = common_scale({&left_, &right_});
        const double room = v_.right() + 24;
        const bool round = right_.part && right_.part->face == ShapePart::Face::wall;
        if (!round) draw_wall("Left wall", left_, scale, v_.left - 24, -1);
        draw_wall(round ? "Wall, all round" : "Right wall", right_, scale, room, 1);
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

    /// The bands of one face with the way that it has really gone as a line; `at` is where a place
    /// (the middle or an end of it) with a value stands.
    void draw_bands(const Bands& bands, const std::string& clip, const Box& box,
                    const std::function<std::array<double, 2>(double, double)>& at) {
        svg_.define(fmt::format("<clipPath id=\"{}\"><rect x=\"{}\" y=\"{}\" width=\"{}\" "
                                "height=\"{}\"/></clipPath>",
                                clip, px(box.x), px(box.y), px(box.width), px(box.height)));
        svg_.raw("<g clip-path=\"url(#" + clip + ")\">");
        const auto& places = bands.part->places;
        draw_cause_bands(svg_, bands.causes,
                         [&](std::size_t i, double value) { return at(places[i].at_nm, value); });
        std::vector<std::array<double, 2>> way;
        for (const ShapePart::Place& place : places)
            way.push_back(at(place.at_nm, bands.part->moved_nm(place)));
        svg_.path(path_data(way, false), way_style);
        svg_.raw("</g>");
    }

    /// `sense` -1: values grow to the left from x0, 1: to the right.
    void draw_wall(const std::string& name, const Bands& bands, const AxisScale& scale, double x0,
                   double sense) {
        const double outer = x0 + sense * wall_width, left = std::min(x0, outer);
        const auto x_of = [&](double value) { return x0 + sense * wall_width * scale.part(value); };
        for (const double tick : scale.ticks(4)) {
            svg_.line(x_of(tick), v_.top, x_of(tick), v_.bottom(),
                      "stroke=\"#e2e2e2\" stroke-width=\"0.8\"");
            svg_.text(x_of(tick), v_.bottom() + 15, fmt::format("{:.4g}", tick),
                      small(Anchor::middle));
        }
        if (bands.part)
            draw_bands(bands, sense < 0 ? "wallclipleft" : "wallclipright",
                       {left, v_.top, wall_width, v_.height()}, [&](double z, double value) {
                           return std::array<double, 2>{x_of(value), v_.y(z)};
                       });
        svg_.line(x_of(0), v_.top, x_of(0), v_.bottom(), "stroke=\"#333333\" stroke-width=\"1\"");
        svg_.rect({left, v_.top, wall_width, v_.height()},
                  "fill=\"none\" stroke=\"#555555\" stroke-width=\"0.8\"");
        svg_.text(left + 0.5 * wall_width, v_.top - 8, name,
                  {12, Anchor::middle, true, "#222222", false, 0});
        svg_.text(left + 0.5 * wall_width, v_.bottom() + 33, "moved outwards (nm)",
                  small(Anchor::middle));
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
        const double axis = c_.domain.revolved() ? 0 : c_.mask.openings.front().centre_x;
        if (floor_.part)
            draw_bands(floor_, "floorclip", {v_.left, top, v_.width(), floor_height},
                       [&](double across, double value) {
                           return std::array<double, 2>{v_.x(axis + across), y_of(value)};
                       });
        svg_.rect({v_.left, top, v_.width(), floor_height},
                  "fill=\"none\" stroke=\"#555555\" stroke-width=\"0.8\"");
        svg_.text(v_.left + 0.5 * v_.width(), top - 8, "Floor",
                  {12, Anchor::middle, true, "#222222", false, 0});
        svg_.text(v_.left - 44, top + 0.5 * floor_height, "moved down (nm)",
                  small(Anchor::middle, -90));
        const AxisScale across{v_.x_min, v_.x_max, false};
        for (const double tick : across.ticks(4))
            svg_.text(v_.x(tick), top + floor_height + 15, fmt::format("{:.4g}", tick),
                      small(Anchor::middle));
        svg_.text(v_.left + 0.5 * v_.width(), top + floor_height + 32,
                  c_.domain.revolved() ? "r (nm)" : "x (nm)", small(Anchor::middle));
    }

    void draw_legend(double x) {
        fluxes::CauseFields shares(fluxes::cause_count); ///< of the whole, largest of each face
        double most = 0;
        for (const Bands* bands : {&left_, &right_, &floor_}) {
            if (!bands->part) continue;
            const auto range = band_range(bands->causes);
            const double whole = range[1] - range[0];
            for (std::size_t k = 0; k < shares.size() && whole > 0; ++k) {
                double largest = 0;
                for (const double value : bands->causes[k])
                    largest = std::max(largest, std::fabs(value));
                shares[k].push_back(largest / whole);
                most = std::max(most, shares[k].back());
            }
        }
        svg_.text(x, v_.top + 4, "Causes", {12, Anchor::start, true, "#222222", false, 0});
        const double used = draw_cause_legend(svg_, shares, 2e-3 * most, x, v_.top + 16);
        const double y = v_.top + 30 + used;
        svg_.path(path_data({{x, y}, {x + 24, y}}, false), way_style);
        svg_.text(x + 32, y + 4, "way of the surface itself",
                  {11, Anchor::start, false, "#222222", false, 0});
    }

    void draw_words() {
        svg_.text(margin, 38, c_.title, {20, Anchor::start, true, "#111111", false, 0});
        svg_.text(margin, 60,
                  fmt::format("What made the shape: how far each cause has moved the {} since they "
                              "were first there · after {}",
                              c_.mask.openings.front().name + " walls and floor",
                              time_text(state_.time_s)),
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
    Bands left_, right_, floor_;
    View v_;
    Svg svg_;
};

} // namespace

std::string cause_picture_svg(const Case& c, const SurfaceState& state,
                              const std::vector<ShapePart>& parts) {
    return Picture(c, state, parts).draw();
}

} // namespace rille::engine
