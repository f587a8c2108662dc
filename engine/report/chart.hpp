// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/section.hpp"

#include <array>
#include <optional>
#include <string>
#include <vector>

namespace rille::engine {

/// How a figure is set. The content is the same; `slide` is exactly 1920 x 1080 px with text that
/// reads from the back of a room, `narrow` is for screens of a hand's width.
enum class FigureForm { page, narrow, slide };

/// What stands around every figure.
struct FigureText {
    /// Starts every id inside the SVG; figures of one page need different ones. Letters, digits, -.
    std::string id = "figure";
    std::string title;
    std::string subtitle;               ///< may be empty
    std::vector<std::string> constants; ///< what stays constant, listed beneath
    std::vector<std::string> notes;     ///< meaning of bars and marks, listed beneath
    std::string caution = "model prediction, not a released recipe · errors shown are numerical "
                          "only"; ///< one line inside
};

/// An axis: linear, logarithmic or of words.
struct ChartAxis {
    std::string title;
    std::string unit; ///< "nm"; "1" or empty: none is written
    bool logarithmic = false;
    std::optional<double> from, to; ///< the range shown at least; else from the data
    bool from_zero = false;         ///< zero is shown even where the data lie far from it
    /// Not empty: value i stands for words[i], placed at equal distances.
    std::vector<std::string> words;
};

struct ChartPoint {
    double x = 0, y = 0;
    double error = 0;     ///< half-width of the error bar; 0 = none
    bool is_open = false; ///< censored: an open marker
    /// Marks the point for the page: written as data-point. Empty: not to be chosen.
    std::string key;
    std::string words; ///< what is said of it when pointed at: "300 V: 4.1 ± 0.2 nm"
};

struct ChartLine {
    std::string name;
    std::vector<ChartPoint> points; ///< in the order in which they are joined
    bool is_joined = true;
    bool has_markers = true;
    /// Which of the looks; lines of one look belong together (measured beside predicted).
    std::optional<std::size_t> look;
    bool is_measured = false; ///< crosses with their bars, never joined
};

/// Points on axes, joined to lines. Values that are not finite, or not positive on a logarithmic
/// axis, are left out.
struct LineChart {
    FigureText text;
    ChartAxis x, y;
    std::vector<ChartLine> lines;
    /// Levels of y that are asked for: a target's limits, drawn across.
    std::vector<std::pair<double, std::string>> levels;
};

enum class CellKind { value, open, failed, missing, met, missed, undecided };

struct HeatCell {
    CellKind kind = CellKind::missing;
    std::optional<double> value;
    std::string text;  ///< printed in the cell where it fits
    std::string key;   ///< as of ChartPoint
    std::string words; ///< as of ChartPoint
};

/// A table of cells over two axes of values. Values are shaded light to dark by one scale (which is
/// left out when no cell has kind `value` or `open`), verdicts by colour and sign, and what gave no
/// value is hatched.
struct HeatMap {
    FigureText text;
    std::string x_title, y_title, value_title; ///< units included
    std::vector<std::string> x_values, y_values;
    std::vector<HeatCell> cells; ///< x_values.size() * y_values.size(), x runs first, y upwards
};

/// One outline among others.
struct ProfileOutline {
    std::string name;
    Section lines;                   ///< (x, z) [nm]
    std::optional<std::size_t> look; ///< of the overlay; else by its place
    std::string note;                ///< small, beneath the name: "4.1 ± 0.2 nm", "failed"
    std::string key, words;          ///< as of ChartPoint
    bool is_failed = false;          ///< the panel is hatched
};

/// Outlines side by side along an axis, all to one scale.
struct ProfileRow {
    FigureText text;
    std::string axis_title; ///< "rf bias amplitude (V)"
    std::vector<ProfileOutline> panels;
    Section before; ///< drawn dashed in every panel; may be empty
};

/// Outlines over each other, to one scale, with depth and width axes.
struct ProfileOverlay {
    FigureText text;
    std::vector<ProfileOutline> outlines;
    Section before;              ///< dashed; may be empty
    std::vector<double> heights; ///< z at which a fine line is drawn: where CDs are read
};

struct Bar {
    std::string name;
    double value = 0;
    double error = 0; ///< half-width of the error bar; 0 = none
    std::string text; ///< beside the bar: "62 %"
    /// Ends of an error bar that is not even; `error` goes unused.
    std::optional<double> low{}, high{};

    double lower() const { return low.value_or(value - error); }
    double upper() const { return high.value_or(value + error); }
};

/// Bars from zero, one a row, longest text first fitted.
struct BarChart {
    FigureText text;
    std::string axis_title; ///< units included
    std::vector<Bar> bars;
};

std::string chart_svg(const LineChart&, FigureForm);
std::string chart_svg(const HeatMap&, FigureForm);
std::string chart_svg(const ProfileRow&, FigureForm);
std::string chart_svg(const ProfileOverlay&, FigureForm);
std::string chart_svg(const BarChart&, FigureForm);

/// Look of a line: colour, dashes and marker. Colours have a contrast of at least 3 to white and
/// stay apart in lightness or in hue for an eye without red or green cones; markers and dashes
/// differ as well.
struct LineLook {
    std::string colour; ///< #rrggbb
    std::string dashes; ///< of stroke-dasharray, in widths of the line; empty = solid
    int marker = 0;     ///< 0 circle, 1 square, 2 triangle, 3 diamond, ...
};
LineLook line_look(std::size_t index);

/// The scale of heat maps: share 0 (light) to 1 (dark), lightness falling evenly.
std::string heat_colour(double share);

/// Round numbers 1, 2, 5 x 10^n inside [low, high], at most `most` of them.
std::vector<double> round_ticks(double low, double high, std::size_t most);
/// On a logarithmic axis: powers of ten, with their 2 and 5 where there is room.
std::vector<double> log_ticks(double low, double high, std::size_t most);

} // namespace rille::engine
