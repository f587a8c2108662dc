// SPDX-License-Identifier: Apache-2.0
#include "fluxes/in_plane.hpp"

#include <algorithm>
#include <array>
#include <cmath>
#include <functional>

namespace rille::fluxes {
namespace {

constexpr double pi = 3.14159265358979323846;

double normal_cdf(double x) {
    return 0.5 * std::erfc(-x / std::sqrt(2.0));
}
double normal_pdf(double x) {
    return std::exp(-0.5 * x * x) / std::sqrt(2.0 * pi);
}

/// Five-point Gauss-Hermite rule for a standard normal variable, the two signs taken together.
constexpr std::array<double, 3> hermite_point = {0.0, 1.3556261799742659, 2.8569700138728056};
constexpr std::array<double, 3> hermite_weight = {0.5333333333333333, 0.4441518440097944,
                                                  0.0225148226568723};
/// Four-point Gauss-Legendre rule on [0, 1].
constexpr std::array<double, 4> legendre_point = {0.0694318442029737, 0.3300094782075719,
                                                  0.6699905217924281, 0.9305681557970263};
constexpr std::array<double, 4> legendre_weight = {0.1739274225687269, 0.3260725774312731,
                                                   0.3260725774312731, 0.1739274225687269};

/// Flux shares beyond the edges of the upper half: steps of 1/256, in the tail of an eighth of what
/// is left, down to 1e-8. A bin then errs by less than 1e-4 of the flux and 0.2 % of its own tail.
std::vector<double> tail_levels() {
    std::vector<double> tail;
    for (double t = 0.5; t > 1e-8;) {
        t = std::max(t - 1 / 256.0, 0.875 * t);
        tail.push_back(t);
    }
    return tail;
}

/// Edges of a distribution even in phi, from its share above phi > 0; `largest` ends the support.
std::vector<double> symmetric_edges(const std::function<double(double)>& share_above,
                                    double largest) {
    std::vector<double> upper;
    double floor = 0;
    for (double level : tail_levels()) {
        double low = floor, high = largest;
        for (int i = 0; i < 60 && high - low > 1e-14; ++i) {
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

/// Slope at an edge; 90 deg stands for infinity.
double slope_of(double phi) {
    if (phi >= 0.5 * pi) return HUGE_VAL;
    if (phi <= -0.5 * pi) return -HUGE_VAL;
    return std::tan(phi);
}

/// Running sums at the edges from the nodes, so that tables and nodes agree to round-off.
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

/// Every ion at one slope: a bin too narrow to be seen.
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

/// One value of the normal energy: normal slopes of standard deviation sigma.
struct Layer {
    double normal_ev, weight, sigma;
};

std::vector<Layer> thermal_layers(const ThermalFall& law) {
    if (law.normal_ev == 0)
        return {{law.drop_ev, 1.0, std::sqrt(0.5 * law.transverse_ev / law.drop_ev)}};
    // Panels in x = (Ez - drop) / Tpar; fine near 0 when thermal energy alone carries the ions.
    std::vector<double> ends = {0, 0.5, 1, 2, 4, 8, 16, 32};
    if (law.drop_ev < 5 * law.normal_ev)
        ends.insert(ends.begin() + 1, {1e-6, 1e-5, 1e-4, 1e-3, 1e-2, 0.05, 0.2});
    std::vector<Layer> layers;
    for (std::size_t p = 0; p + 1 < ends.size(); ++p)
        for (std::size_t g = 0; g < legendre_point.size(); ++g) {
            const double width = ends[p + 1] - ends[p];
            const double x = ends[p] + width * legendre_point[g];
            const double energy = law.drop_ev + law.normal_ev * x;
            layers.push_back({energy, legendre_weight[g] * width * std::exp(-x),
                              std::sqrt(0.5 * law.transverse_ev / energy)});
        }
    double sum = 0;
    for (const Layer& layer : layers)
        sum += layer.weight;
    for (Layer& layer : layers)
        layer.weight /= sum;
    return layers;
}

/// Nodes of one bin and one out-of-plane point, one per layer.
void add_layers(InPlane& plane, const std::vector<Layer>& layers, bool fixed_energy, int bin,
                std::size_t point, bool merge) {
    const double low = slope_of(plane.angle[bin]), high = slope_of(plane.angle[bin + 1]);
    InPlane::Node sum{bin, 0, 0, 0, static_cast<int>(plane.spectra.size())};
    std::vector<InPlane::EnergyShare> spectrum;
    for (const Layer& layer : layers) {
        const double a = low / layer.sigma, b = high / layer.sigma;
        const double mass = a > 0 ? normal_cdf(-a) - normal_cdf(-b) : normal_cdf(b) - normal_cdf(a);
        const double weight = mass * layer.weight * hermite_weight[point];
        if (!(weight > 1e-18)) continue;
        const double from = std::max(low, -1e9), to = std::min(high, 1e9);
        const double slope =
            std::clamp(layer.sigma * (normal_pdf(a) - normal_pdf(b)) / mass, from, to);
        const double across = layer.sigma * hermite_point[point];
        const double stretch = 1 + slope * slope + across * across;
        const double energy = fixed_energy ? layer.normal_ev : layer.normal_ev * stretch;
        const InPlane::Node node{bin, slope, 1 / std::sqrt(stretch), weight, 0};
        if (!merge) {
            plane.nodes.push_back(node);
            plane.nodes.back().spectrum = static_cast<int>(plane.spectra.size());
            plane.spectra.push_back({{energy, 1.0}});
            continue;
        }
        sum.weight += weight;
        sum.slope += weight * slope;
        sum.cos_polar += weight * node.cos_polar;
        spectrum.push_back({energy, weight});
    }
    if (!(sum.weight > 0)) return;
    for (auto& part : spectrum)
        part.share /= sum.weight;
    sum.slope /= sum.weight;
    sum.cos_polar /= sum.weight;
    plane.nodes.push_back(sum);
    plane.spectra.push_back(std::move(spectrum));
}

InPlane from_layers(const std::vector<Layer>& layers, bool fixed_energy) {
    InPlane plane;
    plane.angle = symmetric_edges(
        [&](double phi) {
            double sum = 0;
            for (const Layer& l : layers)
                sum += l.weight * normal_cdf(-slope_of(phi) / l.sigma);
            return sum;
        },
        0.5 * pi);
    // Layers of nearly one spread share a node; the energies stay apart in its spectrum.
    const bool merge = layers.front().sigma < 1.2 * layers.back().sigma || layers.size() == 1;
    for (int bin = 0; bin + 1 < static_cast<int>(plane.angle.size()); ++bin)
        for (std::size_t point = 0; point < hermite_point.size(); ++point)
            add_layers(plane, layers, fixed_energy, bin, point, merge);
    sum_up(plane);
    return plane;
}

/// Ions of one polar angle, every azimuth alike: the slope is tangent * cos(azimuth).
struct Ring {
    double tangent, cosine, weight;
    int spectrum;
};

std::vector<Ring> rings_of(const IonHistogram& law, InPlane& plane) {
    constexpr int energies_per_bin = 8;
    std::vector<Ring> rings;
    for (std::size_t a = 0; a + 1 < law.cosine.size(); ++a) {
        const double column = law.angle_cdf[a + 1] - law.angle_cdf[a];
        if (!(column > 0)) continue;
        std::vector<InPlane::EnergyShare> spectrum;
        for (std::size_t e = 0; e + 1 < law.energy.size(); ++e) {
            const double share = law.energy_cdf[a][e + 1] - law.energy_cdf[a][e];
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
    InPlane operator()(const ThermalFall& law) const {
        const std::vector<Layer> layers = thermal_layers(law);
        if (law.transverse_ev > 0) return from_layers(layers, false);
        std::vector<InPlane::EnergyShare> spectrum;
        for (const Layer& layer : layers)
            spectrum.push_back({layer.normal_ev, layer.weight});
        return single_slope(0, 0, std::move(spectrum));
    }
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

double InPlane::share_below(double phi) const {
    const Place p = place(phi);
    return share[p.bin] + p.part * (share[p.bin + 1] - share[p.bin]);
}

double InPlane::moment_below(double phi) const {
    const Place p = place(phi);
    if (p.part == 0) return moment[p.bin];
    if (p.part == 1) return moment[p.bin + 1];
    // Uniform in sin(phi) inside the bin, then shifted so that the bin's own moment is kept.
    const double a = angle[p.bin], b = angle[p.bin + 1];
    const double whole = std::sin(b) - std::sin(a);
    const double mass = share[p.bin + 1] - share[p.bin];
    const double density = mass / whole;
    const double left = density * (std::cos(a) - std::cos(phi));
    const double all = density * (std::cos(a) - std::cos(b));
    const double excess = moment[p.bin + 1] - moment[p.bin] - all;
    return moment[p.bin] + left + p.part * excess;
}

} // namespace rille::fluxes
