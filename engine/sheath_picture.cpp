// SPDX-License-Identifier: Apache-2.0
#include "engine/sheath_output.hpp"

#include "engine/case.hpp"
#include "engine/number_text.hpp"
#include "engine/picture_parts.hpp"
#include "engine/sheath_figures.hpp"

#include <algorithm>
#include <array>
#include <cmath>
#include <fmt/format.h>

namespace rille::engine {

namespace {

constexpr double margin = 28, head = 84, panel_width = 430, panel_height = 250, gap = 96;
constexpr double row_height = panel_height + 96, foot = 46, legend_room = 150;

/// Colour and dashes of a line; each differs from the others in lightness, too.
struct LineLook {
    const char* colour;
    const char* dashes;
};
constexpr std::array<LineLook, 6> looks = {{{"#102460", ""},
                                            {"#c8662a", "8 3"},
                                            {"#1f7a6d", "3 2"},
                                            {"#8c4c8c", "10 3 2 3"},
                                            {"#7a9cc6", ""},
                                            {"#b58a00", "5 2"}}};

struct Curve {
    std::string name;
    LineLook look;
    std::vector<std::array<double, 2>> points; ///< in data units
};

struct Panel {
    double x = 0, y = 0; ///< upper left corner [px]
    double right_value = 1, top_value = 1;
    double px_x(double v) const { return x + panel_width * v / right_value; }
    double px_y(double v) const { return y + panel_height * (1 - v / top_value); }
};

/// Steps of a histogram as density.
std::vector<std::array<double, 2>> steps(const Spectrum& spectrum) {
    std::vector<std::array<double, 2>> points;
    for (std::size_t b = 0; b < spectrum.share.size(); ++b) {
        const double density = spectrum.share[b] / (spectrum.edges[b + 1] - spectrum.edges[b]);
        points.push_back({spectrum.edges[b], density});
        points.push_back({spectrum.edges[b + 1], density});
    }
    return points;
}

/// Share of the flux within each angle up to where 99.5 % lies.
std::vector<std::array<double, 2>> running_share(const fluxes::IonDistribution& ions,
                                                 double widest_deg) {
    std::vector<std::array<double, 2>> points;
    for (int i = 0; i <= 200; ++i) {
        const double angle = widest_deg * i / 200;
        points.push_back({angle, 100 * ions.share_within_deg(angle)});
    }
    return points;
}

void draw_axes(Svg& svg, const Panel& panel, const std::string& across, const std::string& up) {
    const TextStyle small{10.5, Anchor::middle, false, "#222222", false, 0};
    const double step_x = round_length(panel.right_value / 4),
                 step_y = round_length(panel.top_value / 3);
    for (double v = 0; v <= panel.right_value * (1 + 1e-9); v += step_x) {
        svg.line(panel.px_x(v), panel.y, panel.px_x(v), panel.y + panel_height,
                 "stroke=\"#dddddd\" stroke-width=\"0.8\"");
        svg.text(panel.px_x(v), panel.y + panel_height + 16, fmt::format("{:.4g}", v), small);
    }
    for (double v = 0; v <= panel.top_value * (1 + 1e-9); v += step_y) {
        svg.line(panel.x, panel.px_y(v), panel.x + panel_width, panel.px_y(v),
                 "stroke=\"#dddddd\" stroke-width=\"0.8\"");
        svg.text(panel.x - 6, panel.px_y(v) + 4, fmt::format("{:.3g}", v),
                 {10.5, Anchor::end, false, "#222222", false, 0});
    }
    svg.rect({panel.x, panel.y, panel_width, panel_height},
             "fill=\"none\" stroke=\"#333333\" stroke-width=\"1\"");
    svg.text(panel.x + 0.5 * panel_width, panel.y + panel_height + 34, across,
             {11.5, Anchor::middle, false, "#222222", false, 0});
    svg.text(panel.x - 46, panel.y + 0.5 * panel_height, up,
             {11.5, Anchor::middle, false, "#222222", false, -90});
}

void draw_curves(Svg& svg, Panel panel, const std::vector<Curve>& curves, const std::string& across,
                 const std::string& up) {
    draw_axes(svg, panel, across, up);
    for (const Curve& curve : curves) {
        std::vector<std::array<double, 2>> line;
        for (const auto& p : curve.points)
            if (p[0] <= panel.right_value)
                line.push_back({panel.px_x(p[0]), panel.px_y(std::min(p[1], panel.top_value))});
        svg.path(path_data(line, false),
                 fmt::format("fill=\"none\" stroke=\"{}\" stroke-width=\"1.8\" "
                             "stroke-linejoin=\"round\" stroke-dasharray=\"{}\"",
                             curve.look.colour, curve.look.dashes));
    }
}

void draw_plasma(Svg& svg, const Plasma& plasma, double y) {
    struct Particle {
        std::string name;
        const fluxes::IonDistribution* distribution;
    };
    std::vector<Particle> particles;
    for (const IonAtWafer& ion : plasma.arrivals->ions) {
        particles.push_back({ion.name, &ion.ions.front()});
        for (const auto& fast : ion.fast_neutrals)
            particles.push_back({"fast neutrals of " + ion.name, &fast});
    }
    double highest = 0, widest = 0;
    for (const Particle& p : particles) {
        highest = std::max(highest, figures_of(*p.distribution).high_ev);
        double angle = 0.05;
        while (angle < 90 && p.distribution->share_within_deg(angle) < 0.98)
            angle *= 1.1;
        widest = std::max(widest, std::min(angle, 90.0));
    }
    Panel energy{margin + 60, y + 30, 1.15 * highest, 0};
    Panel angle{energy.x + panel_width + gap, y + 30, widest, 100};
    std::vector<Curve> energies, angles;
    for (std::size_t i = 0; i < particles.size(); ++i) {
        const LineLook look = looks[i % looks.size()];
        const Spectrum spectrum = energy_spectrum(*particles[i].distribution, highest / 120);
        energies.push_back({particles[i].name, look, steps(spectrum)});
        angles.push_back(
            {particles[i].name, look, running_share(*particles[i].distribution, widest)});
        for (const auto& p : energies.back().points)
            energy.top_value = std::max(energy.top_value, 1.08 * p[1]);
    }
    svg.text(margin, y + 12, "plasma " + plasma.name,
             {13, Anchor::start, true, "#222222", false, 0});
    draw_curves(svg, energy, energies, "energy at the wafer (eV)", "share of the flux per eV");
    draw_curves(svg, angle, angles, "angle from the wafer normal (deg)",
                "share of the flux within (%)");
    double row = y + 44;
    const double left = angle.x + panel_width + 18;
    for (const Curve& curve : energies) {
        svg.line(left, row - 4, left + 28, row - 4,
                 fmt::format("stroke=\"{}\" stroke-width=\"1.8\" stroke-dasharray=\"{}\"",
                             curve.look.colour, curve.look.dashes));
        svg.text(left + 34, row, curve.name, {11, Anchor::start, false, "#222222", false, 0});
        row += 18;
    }
}

} // namespace

std::string sheath_picture_svg(const Case& c) {
    std::vector<const Plasma*> drawn;
    for (const auto& [name, plasma] : c.plasmas)
        if (plasma.arrivals && !plasma.arrivals->ions.empty()) drawn.push_back(&plasma);
    const double width = margin + 60 + 2 * panel_width + gap + 18 + legend_room + margin;
    const double height = head + row_height * static_cast<double>(drawn.size()) + foot;
    Svg svg(width, height, c.title + ": ions at the wafer");
    svg.text(margin, 40, c.title, {20, Anchor::start, true, "#111111", false, 0});
    svg.text(margin, 62, "Energies and angles of the ions at the wafer",
             {12.5, Anchor::start, false, "#444444", false, 0});
    double y = head;
    for (const Plasma* plasma : drawn) {
        draw_plasma(svg, *plasma, y);
        y += row_height;
    }
    svg.line(margin, height - 30, width - margin, height - 30,
             "stroke=\"#999999\" stroke-width=\"0.6\"");
    svg.text(margin, height - 13,
             "model prediction, not a released recipe · voltages of the model are no permitted "
             "settings of a tool",
             {10.5, Anchor::start, false, "#444444", false, 0});
    return svg.finish();
}

} // namespace rille::engine
