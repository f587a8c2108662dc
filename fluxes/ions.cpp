// SPDX-License-Identifier: Apache-2.0
#include "fluxes/ions.hpp"

#include "fluxes/in_plane.hpp"
#include "fluxes/ion_laws.hpp"

#include <algorithm>
#include <cmath>
#include <mutex>
#include <numeric>
#include <stdexcept>

namespace rille::fluxes {
namespace {

constexpr double pi = 3.14159265358979323846;
constexpr double degree = pi / 180.0;

void require(bool condition, const char* message) {
    if (!condition) throw std::invalid_argument(message);
}

void check_edges(const std::vector<double>& edges, const char* message) {
    require(edges.size() >= 2, message);
    for (std::size_t i = 0; i < edges.size(); ++i)
        require(std::isfinite(edges[i]) && (i == 0 || edges[i] > edges[i - 1]), message);
}

/// Running sum of the shares from 0 to 1.
std::vector<double> running_shares(const std::vector<double>& share) {
    std::vector<double> cdf(1, 0.0);
    for (double w : share) {
        require(std::isfinite(w) && w >= 0, "shares must be finite and not negative");
        cdf.push_back(cdf.back() + w);
    }
    const double sum = cdf.back();
    require(sum > 0, "the shares are all zero");
    for (double& c : cdf)
        c /= sum;
    return cdf;
}

double kept_by_tilt(const IonLaw& law) {
    const auto* tilted = std::get_if<TiltedIons>(&law);
    return tilted ? tilted->kept : 1.0;
}

} // namespace

struct IonDistribution::Impl {
    explicit Impl(IonLaw l) : law(std::move(l)) {}
    IonLaw law;
    mutable std::once_flag once;
    mutable InPlane plane;

    const InPlane& in_plane() const {
        std::call_once(once, [this] { plane = resolve_in_plane(law); });
        return plane;
    }
};

IonDistribution::IonDistribution(std::shared_ptr<const Impl> impl) : impl_(std::move(impl)) {}

IonDistribution IonDistribution::thermal_fall(double drop_ev, double transverse_ev,
                                              double normal_ev) {
    const bool finite =
        std::isfinite(drop_ev) && std::isfinite(transverse_ev) && std::isfinite(normal_ev);
    require(finite && drop_ev >= 0 && transverse_ev >= 0 && normal_ev >= 0 &&
                drop_ev + normal_ev > 0,
            "thermal ions need an energy gain and temperatures that are not negative");
    return IonDistribution(
        std::make_shared<Impl>(IonLaw(ThermalFall{drop_ev, transverse_ev, normal_ev})));
}

IonDistribution IonDistribution::histogram(std::vector<double> energy_edges_ev,
                                           std::vector<double> angle_edges_deg,
                                           std::vector<std::vector<double>> weight) {
    check_edges(energy_edges_ev, "energy edges must be finite and strictly increasing");
    check_edges(angle_edges_deg, "angle edges must be finite and strictly increasing");
    require(energy_edges_ev.front() >= 0, "ion energies must not be negative");
    require(angle_edges_deg.front() >= 0 && angle_edges_deg.back() <= 90,
            "polar angles must lie in 0 to 90 deg");
    const std::size_t bins = angle_edges_deg.size() - 1;
    require(weight.size() + 1 == energy_edges_ev.size(), "one row of weights per energy bin");
    double sum = 0;
    for (const auto& row : weight) {
        require(row.size() == bins, "one weight per angle bin");
        for (double w : row) {
            require(std::isfinite(w) && w >= 0, "weights must be finite and not negative");
            sum += w;
        }
    }
    require(sum > 0, "the weights are all zero");
    IonHistogram law;
    for (double a : angle_edges_deg)
        law.cosine.push_back(std::cos(a * degree));
    if (angle_edges_deg.back() == 90) law.cosine.back() = 0;
    std::vector<double> angle_cdf(1, 0.0);
    for (std::size_t a = 0; a < bins; ++a) {
        std::vector<double> cdf(1, 0.0);
        for (auto& row : weight)
            cdf.push_back(cdf.back() + (row[a] /= sum));
        const double column = cdf.back();
        angle_cdf.push_back(angle_cdf.back() + column);
        if (column > 0)
            for (double& c : cdf)
                c /= column;
        law.energy_cdf.emplace_back(std::move(cdf));
    }
    for (double& c : angle_cdf)
        c /= angle_cdf.back();
    law.angle_cdf = RunningSum(std::move(angle_cdf));
    law.energy = std::move(energy_edges_ev);
    law.weight = std::move(weight);
    return IonDistribution(std::make_shared<Impl>(IonLaw(std::move(law))));
}

IonDistribution IonDistribution::beam(double energy_ev, const Vec3& direction) {
    require(energy_ev >= 0 && direction.z < 0, "a beam needs an energy and a downward direction");
    return IonDistribution(
        std::make_shared<Impl>(IonLaw(IonBeam{energy_ev, direction / direction.length()})));
}

IonDistribution IonDistribution::gaussian(double energy_ev, double tan_sigma) {
    require(energy_ev >= 0 && tan_sigma > 0, "Gaussian ions need an energy and a positive spread");
    return IonDistribution(std::make_shared<Impl>(IonLaw(GaussianSlopes{energy_ev, tan_sigma})));
}

IonDistribution IonDistribution::falling_spectrum(std::vector<double> normal_energy_edges_ev,
                                                  std::vector<double> share, double transverse_ev) {
    check_edges(normal_energy_edges_ev, "energy edges must be finite and strictly increasing");
    require(normal_energy_edges_ev.front() >= 0, "ion energies must not be negative");
    require(share.size() + 1 == normal_energy_edges_ev.size(), "one share per energy bin");
    require(std::isfinite(transverse_ev) && transverse_ev >= 0,
            "the transverse temperature must not be negative");
    FallingSpectrum law;
    law.cdf = running_shares(share);
    law.energy = std::move(normal_energy_edges_ev);
    law.transverse_ev = transverse_ev;
    return IonDistribution(std::make_shared<Impl>(IonLaw(std::move(law))));
}

IonDistribution IonDistribution::mixture(std::vector<double> weight,
                                         std::vector<IonDistribution> parts) {
    require(!parts.empty() && weight.size() == parts.size(), "one weight per part of a mixture");
    IonMixture law;
    law.cdf = running_shares(weight);
    for (std::size_t i = 0; i < parts.size(); ++i) {
        const double share = law.cdf[i + 1] - law.cdf[i];
        if (!(share > 0)) continue;
        law.weight.push_back(share);
        law.part.push_back(std::move(parts[i]));
    }
    if (law.part.size() == 1) return law.part.front();
    law.cdf = running_shares(law.weight);
    return IonDistribution(std::make_shared<Impl>(IonLaw(std::move(law))));
}

IonDistribution IonDistribution::tilted(double tilt_deg, double azimuth_deg) const {
    require(tilt_deg >= 0 && tilt_deg <= 45, "ions can be tilted by 0 to 45 deg");
    require(std::isfinite(azimuth_deg), "the azimuth of a tilt must be finite");
    if (tilt_deg == 0) return *this;
    if (const auto* one = std::get_if<IonBeam>(&impl_->law))
        return beam(one->energy_ev, lean_towards(tilt_deg, azimuth_deg).turned(one->direction));
    if (const auto* sum = std::get_if<IonMixture>(&impl_->law)) {
        std::vector<double> weight;
        std::vector<IonDistribution> parts;
        for (std::size_t i = 0; i < sum->part.size(); ++i) {
            parts.push_back(sum->part[i].tilted(tilt_deg, azimuth_deg));
            weight.push_back(sum->weight[i] * kept_by_tilt(parts.back().impl_->law));
        }
        return mixture(std::move(weight), std::move(parts));
    }
    return IonDistribution(std::make_shared<Impl>(IonLaw(tilt_ions(*this, tilt_deg, azimuth_deg))));
}

IonSample IonDistribution::sample(const std::array<double, 4>& u) const {
    return sample_law(impl_->law, u);
}

double IonDistribution::mean_energy_ev() const {
    return mean_energy_of(impl_->law);
}

double IonDistribution::share_within_deg(double angle_deg) const {
    if (angle_deg < 0) return 0.0;
    if (angle_deg >= 90) return 1.0;
    return share_within(impl_->law, std::tan(angle_deg * degree));
}

double IonDistribution::median_angle_deg() const {
    double low = 0, high = 90;
    for (int i = 0; i < 60; ++i) {
        const double middle = 0.5 * (low + high);
        (share_within_deg(middle) < 0.5 ? low : high) = middle;
    }
    return 0.5 * (low + high);
}

double IonDistribution::mean_rad() const {
    double sum = 0;
    for (const InPlane::Node& node : in_plane().nodes)
        sum += node.weight * std::atan(node.slope);
    return sum;
}

double IonDistribution::spread_rad() const {
    const double mean = mean_rad();
    double sum = 0;
    for (const InPlane::Node& node : in_plane().nodes) {
        const double off = std::atan(node.slope) - mean;
        sum += node.weight * off * off;
    }
    return std::sqrt(sum);
}

std::vector<IonSpread> IonDistribution::spreads() const {
    return spreads_of(impl_->law, *this);
}

std::vector<IonArc> IonDistribution::arcs() const {
    return arcs_of(impl_->law);
}

void IonDistribution::append_content(std::vector<double>& numbers) const {
    append_law(impl_->law, numbers);
}

const InPlane& IonDistribution::in_plane() const {
    return impl_->in_plane();
}

} // namespace rille::fluxes
