// SPDX-License-Identifier: Apache-2.0
#include "engine/cause_bands.hpp"

#include "engine/causes.hpp"

#include <algorithm>
#include <cmath>
#include <fmt/format.h>

namespace rille::engine {

namespace {

using Points = std::vector<std::array<double, 2>>;

double part_of(double value, bool above) {
    return above ? std::max(value, 0.0) : std::min(value, 0.0);
}

std::string swatch_fill(const CauseLook& look) {
    return fmt::format("fill=\"{}\" stroke=\"#ffffff\" stroke-width=\"0.4\"", look.colour);
}

} // namespace

SectionWalk longest_walk(const Section& section) {
    SectionWalk best;
    for (const SectionLine& line : section) {
        SectionWalk walk;
        for (std::size_t i = 0; i + 1 < line.points.size(); ++i) {
            const auto &a = line.points[i], &b = line.points[i + 1];
            const double length = std::hypot(b[0] - a[0], b[1] - a[1]);
            walk.element.push_back(line.element[i]);
            walk.is_image.push_back(i < line.images);
            walk.arc.push_back(walk.length + 0.5 * length);
            walk.middle.push_back({0.5 * (a[0] + b[0]), 0.5 * (a[1] + b[1])});
            walk.length += length;
        }
        if (walk.length > best.length) best = std::move(walk);
    }
    return best;
}

std::string cause_hatch() {
    return "<pattern id=\"sputtered\" width=\"6\" height=\"6\" patternUnits=\"userSpaceOnUse\" "
           "patternTransform=\"rotate(45)\"><rect width=\"1.6\" height=\"6\" "
           "fill=\"#ffffff\"/></pattern>"
           "<pattern id=\"deposited\" width=\"5\" height=\"5\" patternUnits=\"userSpaceOnUse\">"
           "<circle cx=\"2.5\" cy=\"2.5\" r=\"1\" fill=\"#ffffff\"/></pattern>";
}

void draw_cause_bands(Svg& svg, const fluxes::CauseFields& bands,
                      const std::function<std::array<double, 2>(std::size_t, double)>& place) {
    const std::size_t points = bands.front().size();
    for (const bool above : {true, false}) {
        std::vector<double> base(points, 0.0);
        for (std::size_t k = 0; k < bands.size(); ++k) {
            const auto& band = bands[k];
            if (std::all_of(band.begin(), band.end(),
                            [&](double v) { return part_of(v, above) == 0; }))
                continue;
            Points outline;
            for (std::size_t i = 0; i < points; ++i)
                outline.push_back(place(i, base[i] + part_of(band[i], above)));
            for (std::size_t i = points; i-- > 0;)
                outline.push_back(place(i, base[i]));
            for (std::size_t i = 0; i < points; ++i)
                base[i] += part_of(band[i], above);
            const CauseLook& look = cause_looks()[k];
            const std::string data = path_data(outline, true);
            svg.path(data, swatch_fill(look));
            if (look.hatched) svg.path(data, "fill=\"url(#sputtered)\"");
            if (k == fluxes::deposition_cause) svg.path(data, "fill=\"url(#deposited)\"");
        }
    }
}

std::array<double, 2> band_range(const fluxes::CauseFields& bands) {
    std::array<double, 2> range{};
    for (std::size_t i = 0; i < bands.front().size(); ++i)
        for (const bool above : {true, false}) {
            double sum = 0;
            for (const auto& band : bands)
                sum += part_of(band[i], above);
            range[above] = above ? std::max(range[1], sum) : std::min(range[0], sum);
        }
    return range;
}

double draw_cause_legend(Svg& svg, const fluxes::CauseFields& bands, double least, double x,
                         double y) {
    double at = y;
    for (std::size_t k = 0; k < bands.size(); ++k) {
        const auto& band = bands[k];
        if (std::none_of(band.begin(), band.end(), [&](double v) { return std::fabs(v) > least; }))
            continue;
        const CauseLook& look = cause_looks()[k];
        const Box swatch{x, at, 24, 12};
        svg.rect(swatch, swatch_fill(look));
        if (look.hatched) svg.rect(swatch, "fill=\"url(#sputtered)\"");
        if (k == fluxes::deposition_cause) svg.rect(swatch, "fill=\"url(#deposited)\"");
        svg.text(x + 32, at + 10, look.label, {11, Anchor::start, false, "#222222", false, 0});
        at += 18;
    }
    return at - y;
}

double AxisScale::part(double value) const {
    if (!logarithmic) return (value - low) / (high - low);
    return std::log(std::max(value, low) / low) / std::log(high / low);
}

std::vector<double> AxisScale::ticks(int about) const {
    std::vector<double> at;
    if (logarithmic) {
        for (double v = low; v <= high * (1 + 1e-9); v *= 10)
            at.push_back(v);
        return at;
    }
    const double wanted = (high - low) / about,
                 power = std::pow(10, std::floor(std::log10(wanted)));
    double step = 10 * power;
    for (const double nice : {5.0, 2.0, 1.0})
        if (nice * power >= wanted) step = nice * power;
    for (double i = std::ceil(low / step - 1e-9); i * step <= high + 1e-9 * step; ++i)
        at.push_back(i * step + 0.0); // no -0
    return at;
}

} // namespace rille::engine
