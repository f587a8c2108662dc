// SPDX-License-Identifier: Apache-2.0
#include "fluxes/ion_laws.hpp"

#include "fluxes/sampling.hpp"

#include <algorithm>
#include <cmath>

namespace rille::fluxes {
namespace {

constexpr double pi = 3.14159265358979323846;
constexpr double degree = pi / 180.0;
constexpr int most_rounds = 64; ///< a tilt up to 45 deg leaves most ions flying down

Vec3 downwards(double slope, double azimuth) {
    const double c = 1.0 / std::sqrt(1.0 + slope * slope);
    return {slope * c * std::cos(azimuth), slope * c * std::sin(azimuth), -c};
}

/// Position in [edges[i], edges[i+1]] of a number on the running sum `cdf`.
struct BinDraw {
    std::size_t bin;
    double part;
};
BinDraw bin_below(const std::vector<double>& cdf, std::size_t above, double u) {
    std::size_t i = std::min(above, cdf.size() - 1);
    while (i > 1 && !(cdf[i] > cdf[i - 1]))
        --i;
    const double span = cdf[i] - cdf[i - 1];
    return {i - 1, span > 0 ? std::clamp((u - cdf[i - 1]) / span, 0.0, 1.0) : 0.5};
}
BinDraw draw(const std::vector<double>& cdf, double u) {
    return bin_below(cdf, std::upper_bound(cdf.begin(), cdf.end(), u) - cdf.begin(), u);
}
/// The same, sooner found.
BinDraw draw(const RunningSum& sum, double u) {
    const auto step = static_cast<std::size_t>(u * sum.above.size());
    std::size_t i = sum.above[std::min(step, sum.above.size() - 1)];
    while (i > 0 && sum.value[i - 1] > u)
        --i;
    while (i < sum.value.size() && !(sum.value[i] > u))
        ++i;
    return bin_below(sum.value, i, u);
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
    IonSample operator()(const FallingSpectrum& law) const {
        const BinDraw e = draw(law.cdf, u[2]);
        const double along =
            law.energy[e.bin] + e.part * (law.energy[e.bin + 1] - law.energy[e.bin]);
        const double across = -law.transverse_ev * std::log1p(-u[0]);
        const double slope = along > 0 ? std::sqrt(across / along) : 0.0;
        return {across + along, downwards(slope, 2 * pi * u[1])};
    }
    /// The fourth number picks the part; what is left of it serves a part that is a mixture.
    IonSample operator()(const IonMixture& law) const {
        const BinDraw which = draw(law.cdf, u[3]);
        const double left = std::min(which.part, 1 - 0x1p-53);
        return law.part[which.bin].sample({u[0], u[1], u[2], left});
    }
    /// Where the turned ion does not fly down, another is drawn with numbers hashed from the first.
    IonSample operator()(const TiltedIons& law) const {
        std::array<double, 4> v = u;
        for (int round = 0;; ++round) {
            IonSample ion = law.upright.sample(v);
            ion.direction = law.lean.turned(ion.direction);
            if (ion.direction.z <= -lowest_cosine) return ion;
            if (round == most_rounds) return {ion.energy_ev, law.lean.turned({0, 0, -1})};
            std::uint64_t key = round;
            for (double x : v)
                key = stream_key(key, std::uint64_t(x * 0x1p53));
            for (int d = 0; d < 4; ++d)
                v[d] = unit_interval(stream_key(key, d));
        }
    }
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
    double operator()(const FallingSpectrum& law) const {
        double sum = law.transverse_ev;
        for (std::size_t e = 0; e + 1 < law.energy.size(); ++e)
            sum += (law.cdf[e + 1] - law.cdf[e]) * 0.5 * (law.energy[e] + law.energy[e + 1]);
        return sum;
    }
    double operator()(const IonMixture& law) const {
        double sum = 0;
        for (std::size_t i = 0; i < law.part.size(); ++i)
            sum += law.weight[i] * law.part[i].mean_energy_ev();
        return sum;
    }
    double operator()(const TiltedIons& law) const {
        if (law.kept == 1) return law.upright.mean_energy_ev();
        double sum = 0;
        for (const IonArc& arc : *law.arcs)
            sum += arc.weight * arc.energy_ev;
        return sum;
    }
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
            sum += part * (law.angle_cdf.value[a + 1] - law.angle_cdf.value[a]);
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
    /// 1 - exp(-Ez tan^2 / Tperp), the mean over each bin in closed form.
    double operator()(const FallingSpectrum& law) const {
        if (law.transverse_ev == 0) return 1.0;
        const double t2 = tangent * tangent / law.transverse_ev;
        double outside = 0;
        for (std::size_t e = 0; e + 1 < law.energy.size(); ++e) {
            const double x = t2 * (law.energy[e + 1] - law.energy[e]);
            const double part = x > 0 ? -std::expm1(-x) / x : 1.0;
            outside += (law.cdf[e + 1] - law.cdf[e]) * std::exp(-t2 * law.energy[e]) * part;
        }
        return 1.0 - outside;
    }
    double operator()(const IonMixture& law) const {
        double sum = 0;
        for (std::size_t i = 0; i < law.part.size(); ++i)
            sum += law.weight[i] * law.part[i].share_within_deg(std::atan(tangent) / degree);
        return sum;
    }
    double operator()(const TiltedIons& law) const {
        double sum = 0;
        for (std::size_t i = 0; i < law.arcs->size(); ++i) {
            // Half an arc at a time: the one nearest to the normal may lie in the middle.
            const double half = 0.5 * (*law.arcs)[i].weight;
            const auto [from, middle, to] = (*law.tangents)[i];
            for (double end : {from, to}) {
                const double low = std::min(middle, end), high = std::max(middle, end);
                if (tangent >= high)
                    sum += half;
                else if (tangent > low)
                    sum += half * (tangent - low) / (high - low);
            }
        }
        return sum;
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
    void operator()(const FallingSpectrum& law) const {
        to.insert(to.end(), {4, law.transverse_ev, double(law.energy.size())});
        to.insert(to.end(), law.energy.begin(), law.energy.end());
        to.insert(to.end(), law.cdf.begin(), law.cdf.end());
    }
    void operator()(const IonMixture& law) const {
        to.insert(to.end(), {5, double(law.part.size())});
        to.insert(to.end(), law.weight.begin(), law.weight.end());
        for (const IonDistribution& part : law.part)
            part.append_content(to);
    }
    void operator()(const TiltedIons& law) const {
        to.insert(to.end(), {6, law.tilt_deg, law.azimuth_deg});
        law.upright.append_content(to);
    }
};

} // namespace

Vec3 Lean::turned(const Vec3& d) const {
    const double along = d.x * towards_x + d.y * towards_y;
    const double turned_along = along * cosine - d.z * sine;
    const double shift = turned_along - along;
    return {d.x + shift * towards_x, d.y + shift * towards_y, d.z * cosine + along * sine};
}

RunningSum::RunningSum(std::vector<double> running) : value(std::move(running)) {
    const std::size_t steps = value.size();
    for (std::size_t k = 0; k < steps; ++k)
        above.push_back(static_cast<int>(
            std::upper_bound(value.begin(), value.end(), double(k) / steps) - value.begin()));
}

IonSample sample_law(const IonLaw& law, const std::array<double, 4>& u) {
    return std::visit(Sampler{u}, law);
}

double mean_energy_of(const IonLaw& law) {
    return std::visit(MeanEnergy{}, law);
}

double share_within(const IonLaw& law, double tangent) {
    return std::visit(ShareWithin{tangent}, law);
}

void append_law(const IonLaw& law, std::vector<double>& numbers) {
    std::visit(AppendContent{numbers}, law);
}

} // namespace rille::fluxes
