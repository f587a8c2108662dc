// SPDX-License-Identifier: Apache-2.0
#include "fluxes/in_plane_parts.hpp"

#include <algorithm>
#include <array>
#include <cmath>

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

/// Layers of a bin of a spectrum: panels over which the spread changes little.
void add_panels(std::vector<Layer>& layers, double low, double high, double share,
                double transverse_ev) {
    const auto put = [&](double energy, double weight) {
        layers.push_back({energy, weight, std::sqrt(0.5 * transverse_ev / energy)});
    };
    if (high < 1.02 * low) return put(0.5 * (low + high), share);
    constexpr double gauss = 0.21132486540518712; // two-point Gauss rule on [0, 1]
    constexpr double growth = 1.25;
    const double density = share / (high - low);
    double from = low;
    for (double to = std::max(low, 1e-6 * high); from < high; from = to) {
        to = std::min(high, growth * to);
        if (growth * to > high) to = high; // no sliver at the end
        const double width = to - from;
        put(from + gauss * width, 0.5 * density * width);
        put(to - gauss * width, 0.5 * density * width);
    }
}

/// Ordered by energy; neighbours within 2 % of each other joined, their mean energy kept.
std::vector<Layer> spectrum_layers(const FallingSpectrum& law) {
    std::vector<Layer> fine;
    for (std::size_t e = 0; e + 1 < law.energy.size(); ++e) {
        const double share = law.cdf[e + 1] - law.cdf[e];
        if (share > 0) add_panels(fine, law.energy[e], law.energy[e + 1], share, law.transverse_ev);
    }
    std::vector<Layer> joined;
    double start = -1;
    for (const Layer& layer : fine) {
        if (start < 0 || layer.normal_ev > 1.02 * start) {
            joined.push_back(layer);
            start = layer.normal_ev;
            continue;
        }
        Layer& to = joined.back();
        const double weight = to.weight + layer.weight;
        to.normal_ev = (to.weight * to.normal_ev + layer.weight * layer.normal_ev) / weight;
        to.sigma = (to.weight * to.sigma + layer.weight * layer.sigma) / weight;
        to.weight = weight;
    }
    return joined;
}

/// Layers of nearly one spread that share the nodes of a bin.
using Bundle = std::vector<Layer>;

/// One node a bin and out-of-plane point from a bundle.
class BundleNodes {
public:
    BundleNodes(const std::vector<double>& angle, const Bundle& bundle) : bundle_(bundle) {
        for (double phi : angle)
            slope_.push_back(slope_of(phi));
        for (double slope : slope_)
            for (const Layer& layer : bundle) {
                const double x = slope / layer.sigma;
                below_.push_back(normal_cdf(x));
                above_.push_back(normal_cdf(-x));
                density_.push_back(normal_pdf(x));
            }
    }

    void add(InPlane& plane, int bin, std::size_t point, bool fixed_energy) const {
        const double from = std::max(slope_[bin], -1e9), to = std::min(slope_[bin + 1], 1e9);
        InPlane::Node sum{bin, 0, 0, 0, static_cast<int>(plane.spectra.size())};
        std::vector<InPlane::EnergyShare> spectrum;
        for (std::size_t l = 0; l < bundle_.size(); ++l) {
            const Layer& layer = bundle_[l];
            const std::size_t a = bin * bundle_.size() + l, b = a + bundle_.size();
            // The smaller tail keeps its digits.
            const double mass = slope_[bin] > 0 ? above_[a] - above_[b] : below_[b] - below_[a];
            const double weight = mass * layer.weight * hermite_weight[point];
            if (!(weight > 1e-18)) continue;
            const double slope =
                std::clamp(layer.sigma * (density_[a] - density_[b]) / mass, from, to);
            const double across = layer.sigma * hermite_point[point];
            const double stretch = 1 + slope * slope + across * across;
            const double energy = fixed_energy ? layer.normal_ev : layer.normal_ev * stretch;
            sum.weight += weight;
            sum.slope += weight * slope;
            sum.cos_polar += weight / std::sqrt(stretch);
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

private:
    const Bundle& bundle_;
    std::vector<double> slope_;
    std::vector<double> below_, above_, density_; ///< [edge][layer]
};

InPlane from_bundles(std::vector<double> angle, const std::vector<Bundle>& bundles,
                     bool fixed_energy) {
    InPlane plane;
    plane.angle = std::move(angle);
    std::vector<BundleNodes> nodes;
    for (const Bundle& bundle : bundles)
        nodes.emplace_back(plane.angle, bundle);
    for (int bin = 0; bin + 1 < static_cast<int>(plane.angle.size()); ++bin)
        for (std::size_t point = 0; point < hermite_point.size(); ++point)
            for (const BundleNodes& bundle : nodes)
                bundle.add(plane, bin, point, fixed_energy);
    sum_up(plane);
    return plane;
}

/// Layers, ordered by falling spread, in bundles that span a factor of 1.25 at most.
std::vector<Bundle> bundles_of(const std::vector<Layer>& layers) {
    std::vector<Bundle> bundles;
    for (const Layer& layer : layers) {
        if (bundles.empty() || bundles.back().front().sigma > 1.25 * layer.sigma)
            bundles.emplace_back();
        bundles.back().push_back(layer);
    }
    return bundles;
}

double share_above(const std::vector<Layer>& layers, double phi) {
    double sum = 0;
    for (const Layer& l : layers)
        sum += l.weight * normal_cdf(-slope_of(phi) / l.sigma);
    return sum;
}

InPlane vertical(const std::vector<Layer>& layers) {
    std::vector<InPlane::EnergyShare> spectrum;
    for (const Layer& layer : layers)
        spectrum.push_back({layer.normal_ev, layer.weight});
    return single_slope(0, 0, std::move(spectrum));
}

} // namespace

InPlane from_layers(const std::vector<Layer>& layers, bool fixed_energy) {
    const auto angle =
        symmetric_edges([&](double phi) { return share_above(layers, phi); }, 0.5 * pi);
    return from_bundles(angle, bundles_of(layers), fixed_energy);
}

InPlane from_thermal_fall(const ThermalFall& law) {
    const std::vector<Layer> layers = thermal_layers(law);
    return law.transverse_ev > 0 ? from_layers(layers, false) : vertical(layers);
}

InPlane from_spectrum(const FallingSpectrum& law) {
    const std::vector<Layer> layers = spectrum_layers(law);
    if (!(law.transverse_ev > 0)) return vertical(layers);
    const std::vector<Bundle> bundles = bundles_of(layers);
    std::vector<Layer> mean; // the edges may follow the bundles
    for (const Bundle& bundle : bundles) {
        mean.push_back({0, 0, bundle[bundle.size() / 2].sigma});
        for (const Layer& layer : bundle)
            mean.back().weight += layer.weight;
    }
    const auto angle = symmetric_edges([&](double phi) { return share_above(mean, phi); }, 0.5 * pi,
                                       1e-5 * std::min(1.0, layers.back().sigma));
    return from_bundles(angle, bundles, false);
}

} // namespace rille::fluxes
