// SPDX-License-Identifier: Apache-2.0
#include "engine/report/chart_parts.hpp"

#include <algorithm>
#include <cmath>

namespace rille::engine {
namespace {

constexpr double line_step = 1.35; ///< distance of base lines in sizes of the text

/// Lines of the foot: what stays constant, then the notes. What does not fit into `most` lines is
/// counted in the last one.
std::vector<std::string> foot_lines(const FigureText& text, const TextStyle& style, double width,
                                    std::size_t most) {
    std::vector<std::string> paragraphs;
    if (!text.constants.empty()) {
        std::string all = "Stays constant: ";
        for (std::size_t i = 0; i < text.constants.size(); ++i)
            all += (i ? "; " : "") + text.constants[i];
        paragraphs.push_back(all + ".");
    }
    paragraphs.insert(paragraphs.end(), text.notes.begin(), text.notes.end());
    std::vector<std::string> lines;
    for (const std::string& paragraph : paragraphs)
        for (const std::string& line : wrapped(paragraph, style, width))
            lines.push_back(line);
    if (lines.size() > most) {
        lines.resize(most);
        lines.back() =
            shortened(lines.back(), style, width - text_width(" … more in the report", style)) +
            " … more in the report";
    }
    return lines;
}

double block_height(const std::vector<std::string>& lines, double size) {
    return static_cast<double>(lines.size()) * line_step * size;
}

/// Draws lines of text from the top edge `y`; returns the bottom edge.
double draw_lines(Svg& svg, const std::vector<std::string>& lines, double x, double y,
                  const TextStyle& style) {
    for (const std::string& line : lines) {
        svg.text(x, y + style.size, line, style);
        y += line_step * style.size;
    }
    return y;
}

TextStyle title_style(const Sheet& sheet) {
    return {sheet.size.title, Anchor::start, true, "#111111", false, 0};
}
TextStyle subtitle_style(const Sheet& sheet) {
    return {sheet.size.body, Anchor::start, false, "#444444", false, 0};
}

} // namespace

const FormSizes& form_sizes(FigureForm form) {
    static const FormSizes page{760, 0, 22, 16, 12, 10.5, 1.8, 4.5};
    static const FormSizes narrow{380, 0, 12, 14, 11.5, 10.5, 1.8, 4.2};
    static const FormSizes slide{1920, 1080, 60, 42, 27, 20, 4, 10};
    return form == FigureForm::page ? page : form == FigureForm::narrow ? narrow : slide;
}

TextStyle Sheet::body(Anchor anchor) const {
    return {size.body, anchor, false, "#222222", false, 0};
}

TextStyle Sheet::small(Anchor anchor) const {
    return {size.small, anchor, false, "#444444", false, 0};
}

std::vector<std::string> wrapped(const std::string& text, const TextStyle& style, double width) {
    std::vector<std::string> lines;
    std::string line, word;
    const auto put = [&] {
        if (word.empty()) return;
        const std::string longer = line.empty() ? word : line + " " + word;
        if (!line.empty() && text_width(longer, style) > width) {
            lines.push_back(line);
            line = word;
        } else {
            line = longer;
        }
        word.clear();
    };
    for (const char c : text) {
        if (c == ' ' || c == '\n')
            put();
        else
            word += c;
    }
    put();
    if (!line.empty()) lines.push_back(line);
    for (std::string& one : lines) // a single word may be wider than the sheet
        one = shortened(one, style, width);
    return lines;
}

std::string shortened(const std::string& text, const TextStyle& style, double width) {
    if (text_width(text, style) <= width) return text;
    std::string out = text;
    while (!out.empty() && text_width(out + "…", style) > width) {
        while (!out.empty() && (static_cast<unsigned char>(out.back()) & 0xC0) == 0x80)
            out.pop_back(); // the rest of a letter of several bytes
        if (!out.empty()) out.pop_back();
    }
    return out + "…";
}

TextStyle fitting(const std::string& text, TextStyle style, double width, double least) {
    const double wide = text_width(text, style);
    if (wide > width) style.size = std::max(least, style.size * width / wide);
    return style;
}

Sheet lay_sheet(const FigureText& text, FigureForm form, double room_height) {
    Sheet sheet;
    sheet.form = form;
    sheet.size = form_sizes(form);
    sheet.width = sheet.size.width;
    const double width = sheet.width - 2 * sheet.size.margin;
    sheet.title = wrapped(text.title, title_style(sheet), width);
    sheet.subtitle = wrapped(text.subtitle, subtitle_style(sheet), width);
    if (form == FigureForm::slide) {
        sheet.title.resize(std::min<std::size_t>(sheet.title.size(), 2));
        sheet.subtitle.resize(std::min<std::size_t>(sheet.subtitle.size(), 2));
    }
    sheet.foot = foot_lines(text, sheet.small(), width, form == FigureForm::slide ? 5 : 40);
    sheet.caution = wrapped(text.caution, sheet.small(), width);
    const double head = 0.7 * sheet.size.margin + block_height(sheet.title, sheet.size.title) +
                        block_height(sheet.subtitle, sheet.size.body);
    const double foot = block_height(sheet.foot, sheet.size.small) +
                        block_height(sheet.caution, sheet.size.small) + 1.8 * sheet.size.small +
                        0.4 * sheet.size.margin;
    sheet.height = sheet.size.height > 0 ? sheet.size.height : std::ceil(head + room_height + foot);
    sheet.room = {sheet.size.margin, head, width, sheet.height - head - foot};
    return sheet;
}

Svg start_sheet(const Sheet& sheet, const FigureText& text) {
    Svg svg(sheet.width, sheet.height, text.title);
    const double x = sheet.size.margin;
    double y = draw_lines(svg, sheet.title, x, 0.7 * sheet.size.margin, title_style(sheet));
    draw_lines(svg, sheet.subtitle, x, y, subtitle_style(sheet));
    y = sheet.room.y + sheet.room.height + 0.9 * sheet.size.small;
    y = draw_lines(svg, sheet.foot, x, y, sheet.small());
    y += 0.45 * sheet.size.small;
    svg.line(x, y, sheet.width - x, y, "stroke=\"#999999\" stroke-width=\"0.6\"");
    draw_lines(svg, sheet.caution, x, y + 0.25 * sheet.size.small, sheet.small());
    return svg;
}

std::vector<double> spread(const std::vector<double>& wanted, double gap, double low, double high) {
    std::vector<std::size_t> order(wanted.size());
    for (std::size_t i = 0; i < order.size(); ++i)
        order[i] = i;
    std::stable_sort(order.begin(), order.end(),
                     [&](std::size_t a, std::size_t b) { return wanted[a] < wanted[b]; });
    std::vector<double> places(wanted.size());
    double least = low;
    for (const std::size_t i : order)
        least = (places[i] = std::max(wanted[i], least)) + gap;
    double most = high;
    for (auto i = order.rbegin(); i != order.rend(); ++i)
        most = (places[*i] = std::min(places[*i], most)) - gap;
    return places;
}

} // namespace rille::engine
