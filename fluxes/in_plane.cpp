// SPDX-License-Identifier: Apache-2.0
#include "fluxes/in_plane.hpp"

#include "fluxes/in_plane_parts.hpp"

#include <algorithm>
#include <cmath>

namespace rille::fluxes {
namespace {

constexpr double pi = 3.14159265358979323846;

} // namespace

std::vector<double> tail_levels() {
    std::vector<double> tail;
    for (double t = 0.5; t > 1e-8;) {
        t = std::max(t - 1 / 256.0, 0.875 * t);
        tail.push_back(t);
    }
    return tail;
}

std::vector<double> symmetric_edges(const std::function<double(double)>& share_above,
                                    double largest, double precision) {
    std::vector<double> upper;
    double floor = 0;
    for (double level : tail_levels()) {
        double low = floor, high = largest;
        for (int i = 0; i < 60 && high - low > precision; ++i) {
            const double middle = 0.5 * (low + high);
            (share_above(middle) > level ? low : high) = middle;
        }
        floor = 0.5 * (low + high);
        if (upper.empty() ? floor > 0 : floor > upper.back() * (1 + 1e-12)) upper.push_back(floor);
    }
    if (upper.empty() || upper.back() < largest) upper.push_back(largest);
    std::vector<double> edges;
    for (auto u = upper.rbegin(); u != upper.rend(); ++u)
        edges.push_back(-*u);
    edges.push_back(0);
    edges.insert(edges.end(), upper.begin(), upper.end());
    return edges;
}

double slope_of(double phi) {
    if (phi >= 0.5 * pi) return HUGE_VAL;
    if (phi <= -0.5 * pi) return -HUGE_VAL;
    return std::tan(phi);
}

void sum_up(InPlane& plane) {
    const std::size_t bins = plane.angle.size() - 1;
    plane.share.assign(bins + 1, 0.0);
    plane.moment.assign(bins + 1, 0.0);
    double total = 0;
    for (const auto& node : plane.nodes)
        total += node.weight;
    for (auto& node : plane.nodes) {
        node.weight /= total;
        plane.share[node.bin + 1] += node.weight;
        plane.moment[node.bin + 1] += node.weight * node.slope;
    }
    for (std::size_t b = 0; b < bins; ++b) {
        plane.share[b + 1] += plane.share[b];
        plane.moment[b + 1] += plane.moment[b];
    }
}

InPlane single_slope(double slope_x, double slope_y, std::vector<InPlane::EnergyShare> spectrum) {
    constexpr double half_width = 1e-9;
    InPlane plane;
    const double phi = std::atan(slope_x);
    plane.angle = {phi - half_width, phi + half_width};
    const double c = 1.0 / std::sqrt(1 + slope_x * slope_x + slope_y * slope_y);
    plane.nodes.push_back({0, slope_x, c, 1.0, 0});
    plane.spectra.push_back(std::move(spectrum));
    sum_up(plane);
    return plane;
}

namespace {

/// Ions of one polar angle, every azimuth alike: the slope is tangent * cos(azimuth).
struct Ring {
    double tangent, cosine, weight;
    int spectrum;
};

std::vector<Ring> rings_of(const IonHistogram& law, InPlane& plane) {
    constexpr int energies_per_bin = 8;
    std::vector<Ring> rings;
    for (std::size_t a = 0; a + 1 < law.cosine.size(); ++a) {
        const double column = law.angle_cdf.value[a + 1] - law.angle_cdf.value[a];
        if (!(column > 0)) continue;
        std::vector<InPlane::EnergyShare> spectrum;
        for (std::size_t e = 0; e + 1 < law.energy.size(); ++e) {
            const double share = law.energy_cdf[a].value[e + 1] - law.energy_cdf[a].value[e];
            if (!(share > 0)) continue;
            const double width = law.energy[e + 1] - law.energy[e];
            for (int i = 0; i < energies_per_bin; ++i)
                spectrum.push_back({law.energy[e] + width * (i + 0.5) / energies_per_bin,
                                    share / energies_per_bin});
        }
        const double width = std::acos(law.cosine[a + 1]) - std::acos(law.cosine[a]);
        const int wanted = static_cast<int>(std::ceil(width / (0.5 * pi / 180)));
        const int parts = column < 1e-4 ? 3 : std::clamp(wanted, 3, 200);
        for (int i = 0; i < parts; ++i) {
            const double c =
                law.cosine[a] + (law.cosine[a + 1] - law.cosine[a]) * (i + 0.5) / parts;
            rings.push_back({std::sqrt(1 - c * c) / c, c, column / parts,
                             static_cast<int>(plane.spectra.size())});
        }
        plane.spectra.push_back(std::move(spectrum));
    }
    return rings;
}

double ring_azimuth(const Ring& ring, double slope) {
    return std::acos(std::clamp(slope / ring.tangent, -1.0, 1.0));
}

InPlane from_histogram(const IonHistogram& law) {
    InPlane plane;
    const std::vector<Ring> rings = rings_of(law, plane);
    double largest = 0;
    for (const Ring& ring : rings)
        largest = std::max(largest, std::atan(ring.tangent));
    plane.angle = symmetric_edges(
        [&](double phi) {
            double sum = 0;
            for (const Ring& ring : rings)
                sum += ring.weight * ring_azimuth(ring, slope_of(phi));
            return sum / pi;
        },
        largest);
    for (int bin = 0; bin + 1 < static_cast<int>(plane.angle.size()); ++bin)
        for (const Ring& ring : rings) {
            const double from = ring_azimuth(ring, slope_of(plane.angle[bin + 1]));
            const double to = ring_azimuth(ring, slope_of(plane.angle[bin]));
            if (!(to - from > 1e-14)) continue;
            const double slope = ring.tangent * (std::sin(to) - std::sin(from)) / (to - from);
            plane.nodes.push_back(
                {bin, slope, ring.cosine, ring.weight * (to - from) / pi, ring.spectrum});
        }
    sum_up(plane);
    return plane;
}

struct Resolve {
    InPlane operator()(const ThermalFall& law) const { return from_thermal_fall(law); }
    InPlane operator()(const FallingSpectrum& law) const { return from_spectrum(law); }
    InPlane operator()(const IonMixture& law) const { return from_mixture(law); }
    InPlane operator()(const TiltedIons& law) const { return from_arcs(*law.arcs); }
    InPlane operator()(const IonHistogram& law) const { return from_histogram(law); }
    InPlane operator()(const IonBeam& law) const {
        const geometry::Vec3 d = law.direction;
        return single_slope(d.x / d.z, d.y / d.z, {{law.energy_ev, 1.0}});
    }
    InPlane operator()(const GaussianSlopes& law) const {
        return from_layers({{law.energy_ev, 1.0, law.tan_sigma}}, true);
    }
};

} // namespace

InPlane resolve_in_plane(const IonLaw& law) {
    return std::visit(Resolve{}, law);
}

InPlane::Place InPlane::place(double phi) const {
    const int bins = static_cast<int>(angle.size()) - 1;
    if (phi <= angle.front()) return {0, 0.0};
    if (phi >= angle.back()) return {bins - 1, 1.0};
    const int bin =
        static_cast<int>(std::upper_bound(angle.begin(), angle.end(), phi) - angle.begin()) - 1;
    // sin b - sin a = 2 sin((b - a)/2) cos((a + b)/2): keeps its digits in narrow bins.
    const auto gap = [](double a, double b) {
        return std::sin(0.5 * (b - a)) * std::cos(0.5 * (a + b));
    };
    const double whole = gap(angle[bin], angle[bin + 1]);
    return {bin, whole > 0 ? std::clamp(gap(angle[bin], phi) / whole, 0.0, 1.0) : 0.5};
}

InPlane::Below InPlane::below(double phi) const {
    const Place p = place(phi);
    if (p.part == 0) return {share[p.bin], moment[p.bin]};
    if (p.part == 1) return {share[p.bin + 1], moment[p.bin + 1]};
    const double mass = share[p.bin + 1] - share[p.bin];
    // Uniform in sin(phi) inside the bin, then shifted so that the bin's own moment is kept.
    const double a = angle[p.bin], b = angle[p.bin + 1];
    const double density = mass / (std::sin(b) - std::sin(a));
    const double left = density * (std::cos(a) - std::cos(phi));
    const double all = density * (std::cos(a) - std::cos(b));
    const double excess = moment[p.bin + 1] - moment[p.bin] - all;
    return {share[p.bin] + p.part * mass, moment[p.bin] + left + p.part * excess};
}

} // namespace rille::fluxes
