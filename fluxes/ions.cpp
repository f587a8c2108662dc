// SPDX-License-Identifier: Apache-2.0
#include "fluxes/ions.hpp"

#include "fluxes/in_plane.hpp"

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

Vec3 downwards(double slope, double azimuth) {
    const double c = 1.0 / std::sqrt(1.0 + slope * slope);
    return {slope * c * std::cos(azimuth), slope * c * std::sin(azimuth), -c};
}

/// Position in [edges[i], edges[i+1]] of a number on the running sum `cdf`.
struct BinDraw {
    std::size_t bin;
    double part;
};
BinDraw draw(const std::vector<double>& cdf, double u) {
    const auto above = std::upper_bound(cdf.begin(), cdf.end(), u);
    std::size_t i = above == cdf.end() ? cdf.size() - 1 : std::size_t(above - cdf.begin());
    while (i > 1 && !(cdf[i] > cdf[i - 1]))
        --i;
    const double span = cdf[i] - cdf[i - 1];
    return {i - 1, span > 0 ? std::clamp((u - cdf[i - 1]) / span, 0.0, 1.0) : 0.5};
}

struct Sampler {
    const std::array<double, 4>& u;

    IonSample operator()(const ThermalFall& law) const {
        const double across = -law.transverse_ev * std::log1p(-u[0]);
        const double along = law.drop_ev - law.normal_ev * std::log1p(-u[2]);
        const double slope = along > 0 ? std::sqrt(across / along) : 0.0;
        return {across + along, downwards(slope, 2 * pi * u[1])};
    }
    IonSample operator()(const IonHistogram& law) const {
        const BinDraw a = draw(law.angle_cdf, u[0]);
        const double c = law.cosine[a.bin] + a.part * (law.cosine[a.bin + 1] - law.cosine[a.bin]);
        const BinDraw e = draw(law.energy_cdf[a.bin], u[2]);
        const double energy =
            law.energy[e.bin] + e.part * (law.energy[e.bin + 1] - law.energy[e.bin]);
        const double safe = std::max(c, 1e-9);
        return {energy, downwards(std::sqrt(std::max(0.0, 1 - safe * safe)) / safe, 2 * pi * u[1])};
    }
    IonSample operator()(const IonBeam& law) const { return {law.energy_ev, law.direction}; }
    IonSample operator()(const GaussianSlopes& law) const {
        const double slope = law.tan_sigma * std::sqrt(-2.0 * std::log1p(-u[0]));
        return {law.energy_ev, downwards(slope, 2 * pi * u[1])};
    }
};

struct MeanEnergy {
    double operator()(const ThermalFall& law) const {
        return law.drop_ev + law.transverse_ev + law.normal_ev;
    }
    double operator()(const IonHistogram& law) const {
        double sum = 0;
        for (std::size_t e = 0; e < law.weight.size(); ++e)
            for (double w : law.weight[e])
                sum += w * 0.5 * (law.energy[e] + law.energy[e + 1]);
        return sum;
    }
    double operator()(const IonBeam& law) const { return law.energy_ev; }
    double operator()(const GaussianSlopes& law) const { return law.energy_ev; }
};

/// Share of the flux within a polar angle below 90 deg, given by its tangent.
struct ShareWithin {
    double tangent;

    /// 1 - exp(-(V/Tperp) tan^2) / (1 + (Tpar/Tperp) tan^2), the two exponentials integrated.
    double operator()(const ThermalFall& law) const {
        if (law.transverse_ev == 0) return 1.0;
        const double t2 = tangent * tangent / law.transverse_ev;
        return 1.0 - std::exp(-law.drop_ev * t2) / (1.0 + law.normal_ev * t2);
    }
    double operator()(const IonHistogram& law) const {
        const double c = 1.0 / std::sqrt(1.0 + tangent * tangent);
        double sum = 0;
        for (std::size_t a = 0; a + 1 < law.cosine.size(); ++a) {
            const double upper = law.cosine[a], lower = law.cosine[a + 1];
            const double part = std::clamp((upper - c) / (upper - lower), 0.0, 1.0);
            sum += part * (law.angle_cdf[a + 1] - law.angle_cdf[a]);
        }
        return sum;
    }
    double operator()(const IonBeam& law) const {
        return std::hypot(law.direction.x, law.direction.y) <= -law.direction.z * tangent ? 1.0
                                                                                          : 0.0;
    }
    double operator()(const GaussianSlopes& law) const {
        const double x = tangent / law.tan_sigma;
        return -std::expm1(-0.5 * x * x);
    }
};

struct AppendContent {
    std::vector<double>& to;

    void operator()(const ThermalFall& law) const {
        to.insert(to.end(), {0, law.drop_ev, law.transverse_ev, law.normal_ev});
    }
    void operator()(const IonHistogram& law) const {
        to.push_back(1);
        to.push_back(static_cast<double>(law.energy.size()));
        to.insert(to.end(), law.energy.begin(), law.energy.end());
        to.insert(to.end(), law.cosine.begin(), law.cosine.end());
        for (const auto& row : law.weight)
            to.insert(to.end(), row.begin(), row.end());
    }
    void operator()(const IonBeam& law) const {
        to.insert(to.end(), {2, law.energy_ev, law.direction.x, law.direction.y, law.direction.z});
    }
    void operator()(const GaussianSlopes& law) const {
        to.insert(to.end(), {3, law.energy_ev, law.tan_sigma});
    }
};

void check_edges(const std::vector<double>& edges, const char* message) {
    require(edges.size() >= 2, message);
    for (std::size_t i = 0; i < edges.size(); ++i)
        require(std::isfinite(edges[i]) && (i == 0 || edges[i] > edges[i - 1]), message);
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
    law.angle_cdf.assign(1, 0.0);
    for (std::size_t a = 0; a < bins; ++a) {
        std::vector<double> cdf(1, 0.0);
        for (auto& row : weight)
            cdf.push_back(cdf.back() + (row[a] /= sum));
        const double column = cdf.back();
        law.angle_cdf.push_back(law.angle_cdf.back() + column);
        if (column > 0)
            for (double& c : cdf)
                c /= column;
        law.energy_cdf.push_back(std::move(cdf));
    }
    for (double& c : law.angle_cdf)
        c /= law.angle_cdf.back();
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

IonSample IonDistribution::sample(const std::array<double, 4>& u) const {
    return std::visit(Sampler{u}, impl_->law);
}

double IonDistribution::mean_energy_ev() const {
    return std::visit(MeanEnergy{}, impl_->law);
}

double IonDistribution::share_within_deg(double angle_deg) const {
    if (angle_deg < 0) return 0.0;
    if (angle_deg >= 90) return 1.0;
    return std::visit(ShareWithin{std::tan(angle_deg * degree)}, impl_->law);
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

void IonDistribution::append_content(std::vector<double>& numbers) const {
    std::visit(AppendContent{numbers}, impl_->law);
}

const InPlane& IonDistribution::in_plane() const {
    return impl_->in_plane();
}

} // namespace rille::fluxes
