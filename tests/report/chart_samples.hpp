// SPDX-License-Identifier: Apache-2.0
// Figures for the tests, and what an SVG holds read back.
#pragma once

#include "engine/picture.hpp"
#include "engine/report/chart.hpp"
#include "engine/svg.hpp"

#include <cmath>
#include <cstdlib>
#include <fstream>
#include <regex>
#include <string>
#include <vector>

namespace rille::tests {

struct SetText {
    std::string content;
    engine::Box box; ///< as set; of turned texts the box before turning
    double size = 0;
};

inline double attribute(const std::string& tag, const std::string& name) {
    const std::size_t at = tag.find(" " + name + "=\"");
    return at == std::string::npos ? std::nan("")
                                   : std::strtod(tag.c_str() + at + name.size() + 3, nullptr);
}

/// Every text of a page but halos.
inline std::vector<SetText> texts_of(const std::string& svg) {
    std::vector<SetText> texts;
    static const std::regex tag("<text ([^>]*)>([^<]*)</text>");
    for (std::sregex_iterator i(svg.begin(), svg.end(), tag), end; i != end; ++i) {
        const std::string attributes = " " + (*i)[1].str();
        if (attributes.find("aria-hidden") != std::string::npos) continue;
        engine::TextStyle style;
        style.size = attribute(attributes, "font-size");
        style.bold = attributes.find("font-weight") != std::string::npos;
        style.anchor = attributes.find("\"end\"") != std::string::npos      ? engine::Anchor::end
                       : attributes.find("\"middle\"") != std::string::npos ? engine::Anchor::middle
                                                                            : engine::Anchor::start;
        const std::string content = (*i)[2].str();
        texts.push_back({content,
                         engine::text_box(attribute(attributes, "x"), attribute(attributes, "y"),
                                          content, style),
                         style.size});
    }
    return texts;
}

/// What is wrong with the texts of a page: over each other or over its edge.
inline std::vector<std::string> text_faults(const std::string& svg) {
    const double width = attribute(svg.substr(svg.find("<svg")), "width"),
                 height = attribute(svg.substr(svg.find("<svg")), "height");
    const std::vector<SetText> texts = texts_of(svg);
    std::vector<std::string> faults;
    for (std::size_t i = 0; i < texts.size(); ++i) {
        const engine::Box& b = texts[i].box;
        if (b.x < -0.5 || b.y < -0.5 || b.x + b.width > width + 0.5 ||
            b.y + b.height > height + 0.5)
            faults.push_back("off the page: " + texts[i].content);
        for (std::size_t j = 0; j < i; ++j)
            if (b.overlaps(texts[j].box))
                faults.push_back("over each other: " + texts[i].content + " | " + texts[j].content);
    }
    return faults;
}

/// Leaves figures for the eye where RILLE_TEST_PICTURES names a folder.
inline void keep_figure(const std::string& name, const std::string& svg, double scale = 1) {
    const char* folder = std::getenv("RILLE_TEST_PICTURES");
    if (!folder) return;
    std::ofstream(std::string(folder) + "/" + name + ".png", std::ios::binary)
        << engine::png_of(svg, scale);
}

/// A trench `depth` nm deep, its floor `bottom` nm wide, in a period of 120 nm.
inline engine::Section trench_section(double bottom, double depth, double mask = 40) {
    engine::SectionLine line;
    line.points = {
        {-60, mask}, {-32, mask}, {-30, 0},  {-0.5 * bottom, -depth}, {0.5 * bottom, -depth},
        {30, 0},     {32, mask},  {60, mask}};
    return {line};
}

inline engine::FigureText sample_text(const std::string& id) {
    return {id,
            "CD loss against the bias amplitude",
            "five openings, contact etch of 300 nm oxide",
            {"ion_flux of main stays 1.1 mA/cm2 while pressure changes",
             "pitch stays 120 nm while cd changes"},
            {"Bars: 95 % sampling error; grid error not assessed. Open markers: not cleared."},
            "model prediction, not a released recipe · parameters: 14 published, 2 illustrative"};
}

/// Five lines over eight amplitudes; line i, point k is at (100 (k + 1), 1 + i + 0.004 x).
inline engine::LineChart sample_lines() {
    engine::LineChart chart;
    chart.text = sample_text("answer");
    chart.x = {"rf bias amplitude", "V", false, {}, {}, false, {}};
    chart.y = {"bottom CD loss", "nm", false, {}, {}, false, {}};
    for (int i = 0; i < 5; ++i) {
        engine::ChartLine line;
        line.name = std::to_string(30 + 10 * i) + " nm";
        for (int k = 0; k < 8; ++k) {
            const double x = 100 * (k + 1);
            line.points.push_back(
                {x, 1 + i + 0.004 * x, 0.2, i == 4 && k < 2, std::to_string(8 * i + k), "a point"});
        }
        chart.lines.push_back(line);
    }
    engine::ChartLine measured;
    measured.name = "30 nm, measured";
    measured.look = 0;
    measured.is_measured = true;
    measured.points = {{300, 2.6, 0.5, false, "", "measured"}, {600, 3.1, 0.5, false, "", ""}};
    chart.lines.push_back(measured);
    return chart;
}

} // namespace rille::tests
