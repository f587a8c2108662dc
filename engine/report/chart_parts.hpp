// SPDX-License-Identifier: Apache-2.0
// Internal to the figures: the sheet with its head and foot, axes, marks.
#pragma once

#include "engine/report/chart.hpp"
#include "engine/svg.hpp"

#include <string>
#include <vector>

namespace rille::engine {

/// Sizes of one form [px].
struct FormSizes {
    double width, height; ///< height 0: follows from the content
    double margin, title, body, small, line, marker;
};
const FormSizes& form_sizes(FigureForm);

/// A sheet with its head and foot laid; `room` is what is left for the figure between.
struct Sheet {
    FigureForm form = FigureForm::page;
    FormSizes size{};
    double width = 0, height = 0;
    Box room;
    std::vector<std::string> title, subtitle, foot, caution;

    TextStyle body(Anchor anchor = Anchor::start) const;
    TextStyle small(Anchor anchor = Anchor::start) const;
};

/// `room_height` is what the figure needs; a slide has what is left of its height instead.
Sheet lay_sheet(const FigureText&, FigureForm, double room_height);
/// The page with head and foot drawn.
Svg start_sheet(const Sheet&, const FigureText&);

/// Text in lines of at most `width` px, broken at spaces; a word that is wider stands alone.
std::vector<std::string> wrapped(const std::string& text, const TextStyle&, double width);
/// The text, or its beginning with "…", so that it fits.
std::string shortened(const std::string& text, const TextStyle&, double width);
/// The style with its size lowered until the text fits, at least to `least` px.
TextStyle fitting(const std::string& text, TextStyle, double width, double least);
/// Places as near to the wanted ones as can be, at least `gap` apart, inside [low, high], in the
/// order of `wanted`, which need not be sorted.
std::vector<double> spread(const std::vector<double>& wanted, double gap, double low, double high);

/// "title (unit)".
std::string with_unit(const std::string& title, const std::string& unit);

/// An axis on the sheet.
struct AxisScale {
    bool logarithmic = false, is_words = false;
    double low = 0, high = 1;  ///< values at its ends
    double start = 0, end = 1; ///< [px]
    std::vector<double> ticks;
    std::vector<std::string> labels;
    std::string title; ///< with unit, and the power of ten that the labels leave out

    double px(double value) const;
    bool holds(double value) const; ///< a value that can be drawn
};

/// The range of values seen so far.
struct DataRange {
    bool any = false;
    double low = 0, high = 0;
    void add(double value);
};

/// Fixes range, ticks and labels; `most` ticks. `to_ticks`: the ends are moved out to ticks.
AxisScale make_scale(const ChartAxis&, const DataRange& data, std::size_t most, bool to_ticks);

/// Path of a marker around the origin.
std::string marker_path(int marker, double radius);
/// Opens and closes the group of something that can be chosen.
std::string open_group(const std::string& key, const std::string& words);
std::string close_group();

/// Stroke of a line in this look, `width` px.
std::string line_stroke(const LineLook&, double width);

/// Entries of a legend: rows of swatches with names, flowing over `width`. Returns its height;
/// draws only where `svg` is given.
struct LegendEntry {
    std::string name;
    LineLook look;
    bool has_line = true, has_marker = true, is_measured = false;
};
double draw_legend(Svg* svg, const Sheet&, const std::vector<LegendEntry>&, double x, double y,
                   double width);
/// The swatch alone, `length` px from x at height y.
void draw_swatch(Svg&, const Sheet&, const LegendEntry&, double x, double y, double length);

/// A section as path data under a map of (x, z) to the sheet.
struct SectionView {
    double x_min = 0, z_high = 0, scale_x = 1, scale_z = 1, left = 0, top = 0;
    std::array<double, 2> at(const std::array<double, 2>& p) const {
        return {left + (p[0] - x_min) * scale_x, top + (z_high - p[1]) * scale_z};
    }
};
std::string section_path(const Section&, const SectionView&);
/// Extent of a section; `any` false where it is empty.
void add_extent(const Section&, DataRange& x, DataRange& z);

} // namespace rille::engine
