// SPDX-License-Identifier: Apache-2.0
#include "fluxes/in_plane.hpp"
#include "fluxes/ion_laws.hpp"

#include <algorithm>
#include <array>
#include <cmath>

namespace rille::fluxes {
namespace {

constexpr double pi = 3.14159265358979323846;
constexpr double degree = pi / 180.0;
constexpr int azimuths = 64; ///< a multiple of 4: mirror images of the axes fall on each other

/// Edges of the quadrature in the number that draws the polar angle: even, then a tail in which
/// each step takes a quarter of what is left, down to 1e-6.
std::vector<double> polar_levels() {
    std::vector<double> edges;
    for (int i = 0; i <= 24; ++i)
        edges.push_back(i / 32.0);
    for (double left = 0.25; left > 1e-6; left *= 0.75)
        edges.push_back(1 - 0.75 * left);
    edges.push_back(1.0);
    return edges;
}

/// The same for the energy: coarser, the first and the last step cut up.
std::vector<double> energy_levels() {
    std::vector<double> edges = {0, 0.0004, 0.002, 0.01, 0.025};
    for (int i = 1; i < 20; ++i)
        edges.push_back(i / 20.0);
    for (double left : {0.2, 0.04, 0.008})
        edges.push_back(1 - 0.05 * left);
    edges.push_back(1.0);
    return edges;
}

/// Rings about the wafer normal, cut into arcs.
std::vector<IonArc> rings(const IonLaw& law) {
    std::array<double, azimuths + 1> cosine, sine;
    for (int a = 0; a < azimuths; ++a) {
        // One quadrant, turned, so that the four are mirror images to the last bit.
        const int quarter = azimuths / 4, in = a % quarter;
        const double c = std::cos(2 * pi * in / azimuths), s = std::sin(2 * pi * in / azimuths);
        const std::array<std::array<double, 2>, 4> turned = {{{c, s}, {-s, c}, {-c, -s}, {s, -c}}};
        cosine[a] = turned[a / quarter][0];
        sine[a] = turned[a / quarter][1];
    }
    cosine[azimuths] = cosine[0];
    sine[azimuths] = sine[0];
    const std::vector<double> polar = polar_levels(), energy = energy_levels();
    std::vector<IonArc> arcs;
    arcs.reserve(polar.size() * energy.size() * azimuths);
    for (std::size_t p = 0; p + 1 < polar.size(); ++p)
        for (std::size_t e = 0; e + 1 < energy.size(); ++e) {
            // Shifted by the golden ratio from energy to energy: the rings fall between each other.
            const double part = 0.618033988749895 * double(e) + 0.5;
            const double u = polar[p] + (polar[p + 1] - polar[p]) * (part - std::floor(part));
            const IonSample ion = sample_law(law, {u, 0.0, 0.5 * (energy[e] + energy[e + 1]), 0.5});
            const double radius = ion.direction.x, z = ion.direction.z;
            const double weight =
                (polar[p + 1] - polar[p]) * (energy[e + 1] - energy[e]) / azimuths;
            for (int a = 0; a < azimuths; ++a)
                arcs.push_back({{radius * cosine[a], radius * sine[a], z},
                                {radius * cosine[a + 1], radius * sine[a + 1], z},
                                ion.energy_ev,
                                weight});
        }
    return arcs;
}

struct Arcs {
    const IonLaw& whole;

    template <class Law>
    std::vector<IonArc> operator()(const Law&) const {
        return rings(whole);
    }
    std::vector<IonArc> operator()(const IonBeam& law) const {
        return {{law.direction, law.direction, law.energy_ev, 1.0}};
    }
    std::vector<IonArc> operator()(const IonMixture& law) const {
        std::vector<IonArc> all;
        for (std::size_t i = 0; i < law.part.size(); ++i)
            for (IonArc arc : law.part[i].arcs()) {
                arc.weight *= law.weight[i];
                all.push_back(arc);
            }
        return all;
    }
    std::vector<IonArc> operator()(const TiltedIons& law) const { return *law.arcs; }
};

/// In-plane angle below which a share of the flux lies.
double quantile(const InPlane& plane, double share) {
    double low = plane.angle.front(), high = plane.angle.back();
    for (int i = 0; i < 50; ++i) {
        const double middle = 0.5 * (low + high);
        (plane.share_below(middle) < share ? low : high) = middle;
    }
    return 0.5 * (low + high);
}

/// Cuts off the part of an arc that is too close to the wafer plane or below; whether any is left.
bool cut_at_horizon(IonArc& arc) {
    const bool from_low = arc.from.z > -lowest_cosine, to_low = arc.to.z > -lowest_cosine;
    if (from_low && to_low) return false;
    if (!from_low && !to_low) return true;
    const double part = (-lowest_cosine - arc.from.z) / (arc.to.z - arc.from.z);
    const Vec3 cut = (arc.from + (arc.to - arc.from) * part).normalized();
    arc.weight *= from_low ? 1 - part : part;
    (from_low ? arc.from : arc.to) = cut;
    return true;
}

} // namespace

std::vector<IonArc> arcs_of(const IonLaw& law) {
    return std::visit(Arcs{law}, law);
}

Lean lean_towards(double tilt_deg, double azimuth_deg) {
    return {std::sin(tilt_deg * degree), std::cos(tilt_deg * degree),
            std::cos(azimuth_deg * degree), std::sin(azimuth_deg * degree)};
}

TiltedIons tilt_ions(const IonDistribution& upright, double tilt_deg, double azimuth_deg) {
    TiltedIons tilted{upright, tilt_deg, azimuth_deg, lean_towards(tilt_deg, azimuth_deg),
                      0.0,     nullptr,  nullptr};
    auto kept = std::make_shared<std::vector<IonArc>>();
    double all = 0, sum = 0;
    for (IonArc arc : upright.arcs()) {
        all += arc.weight;
        arc.from = tilted.lean.turned(arc.from);
        arc.to = tilted.lean.turned(arc.to);
        if (!cut_at_horizon(arc)) continue;
        sum += arc.weight;
        kept->push_back(arc);
    }
    const auto tangent = [](const Vec3& d) { return std::sqrt(d.x * d.x + d.y * d.y) / -d.z; };
    auto tangents = std::make_shared<std::vector<std::array<double, 3>>>();
    tangents->reserve(kept->size());
    for (IonArc& arc : *kept) {
        arc.weight /= sum;
        tangents->push_back({tangent(arc.from), tangent(arc.from + arc.to), tangent(arc.to)});
    }
    tilted.tangents = std::move(tangents);
    tilted.kept = sum == all ? 1.0 : sum / all;
    tilted.arcs = std::move(kept);
    return tilted;
}

std::vector<IonSpread> spreads_of(const IonLaw& law, const IonDistribution& whole) {
    if (const auto* mixture = std::get_if<IonMixture>(&law)) {
        std::vector<IonSpread> all;
        for (const IonDistribution& part : mixture->part)
            for (const IonSpread& spread : part.spreads())
                all.push_back(spread);
        return all;
    }
    const InPlane& plane = whole.in_plane();
    std::vector<IonSpread> spreads = {{whole.mean_rad(), whole.spread_rad()}};
    // Half of a normal distribution lies within 1.349 standard deviations.
    const double core = (quantile(plane, 0.75) - quantile(plane, 0.25)) / 1.349;
    if (core < 0.7 * spreads.front().spread) spreads.push_back({quantile(plane, 0.5), core});
    return spreads;
}

} // namespace rille::fluxes
