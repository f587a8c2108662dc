// SPDX-License-Identifier: Apache-2.0
#include "engine/symmetric_part.hpp"

#include <cmath>
#include <utility>

namespace rille::engine {
namespace {

constexpr int fewest_cells = 8; // across a part
constexpr double upright = 1e-12;
constexpr double deg = 3.14159265358979323846 / 180;

geometry::Fold planes_of(const Case& c) {
    if (c.start) return {};
    geometry::Fold fold = geometry::symmetry_planes(c.domain, c.mask);
    for (const auto& named : c.plasmas) {
        const double lean = std::sin(named.second.ion_tilt_deg * deg);
        const double azimuth = named.second.ion_azimuth_deg * deg;
        if (std::fabs(lean * std::cos(azimuth)) > upright) fold.x = false;
        if (std::fabs(lean * std::sin(azimuth)) > upright) fold.y = false;
    }
    if (c.domain.cells_x < 2 * fewest_cells) fold.x = false;
    if (c.domain.cells_y < 2 * fewest_cells) fold.y = false;
    return fold;
}

template <class T>
void spread(std::vector<T>& values, const std::vector<int>& source) {
    if (values.empty()) return;
    std::vector<T> all;
    all.reserve(source.size());
    for (const int e : source)
        all.push_back(values[e]);
    values = std::move(all);
}

/// Puts the whole surface into a state that was found on the part; what each element comes from.
std::vector<int> unfold_state(const Case& part, SurfaceState& state) {
    geometry::Unfolded whole = geometry::unfold(part.fold, part.domain, state.surface);
    const std::vector<int>& source = whole.source;
    state.surface = std::move(whole.surface);
    spread(state.material, source);
    spread(state.film, source);
    for (auto& thickness : state.grown.thickness)
        spread(thickness, source);
    spread(state.rate, source);
    for (NamedField& field : state.fields)
        spread(field.value, source);
    for (auto& batch : state.displacement)
        spread(batch, source);
    return source;
}

} // namespace

Case symmetric_part(const Case& whole) {
    Case part = whole;
    part.fold = planes_of(whole);
    part.domain = part.fold.part(whole.domain);
    const geometry::Vec3 origin = part.fold.origin(part.domain);
    for (geometry::Opening& opening : part.mask.openings) {
        opening.centre_x -= origin.x;
        opening.centre_y -= origin.y;
    }
    return part;
}

std::string computed_share(const geometry::Fold& fold) {
    const int copies = fold.copies();
    return copies == 1   ? "the whole period"
           : copies == 2 ? "half of the period"
                         : "a quarter of the period";
}

SurfaceState unfolded(const Case& part, const SurfaceState& state) {
    SurfaceState whole = state;
    if (part.fold.any()) unfold_state(part, whole);
    return whole;
}

SurfaceFlux unfolded(const Case& part, const SurfaceFlux& flux) {
    SurfaceFlux whole = flux;
    if (!part.fold.any()) return whole;
    const std::vector<int> source = unfold_state(part, whole.state);
    for (FluxColumn& column : whole.columns) {
        spread(column.value, source);
        spread(column.error, source);
    }
    for (auto& cause : whole.cause)
        spread(cause, source);
    return whole;
}

} // namespace rille::engine
