// SPDX-License-Identifier: Apache-2.0
#include "fluxes/sheath_filter.hpp"

#include <unsupported/Eigen/FFT>

#include <algorithm>
#include <cmath>
#include <complex>
#include <stdexcept>

namespace rille::fluxes {
namespace {

constexpr double pi = 3.14159265358979323846;
constexpr int energy_bins = 200;
constexpr double steepest = 200; ///< powers by which arrivals may be bunched

void require(bool condition, const char* message) {
    if (!condition) throw std::invalid_argument(message);
}

std::vector<std::complex<double>> components_of(const Waveform& voltage) {
    Eigen::FFT<double> transform;
    std::vector<std::complex<double>> parts;
    transform.fwd(parts, voltage.volt);
    return parts;
}

/// What trajectories in a Child sheath of fixed width show beyond the damping, for entry energies
/// of 0.0005 to 0.05 of the mean voltage and swings of 0.5 and 1, rounded to their common course.
struct Shape {
    double omega_tau;
    double middle; ///< of the spectrum above mean voltage and entry energy, over the swing squared
    double width;  ///< over the damped one
};
Shape shape_at(double omega_tau) {
    static constexpr Shape table[] = {{0, 0, 1},          {0.3, 0.004, 0.998}, {1, 0.022, 0.988},
                                      {2, 0.050, 0.980},  {3, 0.074, 0.995},   {4, 0.086, 1.030},
                                      {5, 0.080, 1.055},  {6, 0.062, 1.060},   {8, 0.030, 1.025},
                                      {10, 0.019, 0.990}, {15, 0.009, 1},      {20, 0.005, 1},
                                      {30, 0.002, 1},     {60, 0, 1}};
    if (omega_tau >= std::end(table)[-1].omega_tau) return {omega_tau, 0, 1};
    const Shape* high = std::upper_bound(std::begin(table), std::end(table), omega_tau,
                                         [](double x, const Shape& p) { return x < p.omega_tau; });
    const Shape& low = high[-1];
    const double part = (omega_tau - low.omega_tau) / (high->omega_tau - low.omega_tau);
    return {omega_tau, low.middle + part * (high->middle - low.middle),
            low.width + part * (high->width - low.width)};
}

/// Each Fourier component times a factor of omega tau, the mean kept.
template <class Factor>
Waveform filtered(const Waveform& voltage, double transit_s, const Factor& factor) {
    auto parts = components_of(voltage);
    const std::size_t count = parts.size();
    for (std::size_t k = 1; k < count; ++k) {
        const double cycles = double(std::min(k, count - k));
        parts[k] *= factor(2 * pi * cycles / voltage.period_s * transit_s);
    }
    Waveform result = voltage;
    Eigen::FFT<double> transform;
    transform.inv(result.volt, parts);
    return result;
}

/// Shift of the middle and gain of the mean, both over the mean voltage.
struct Gains {
    double middle = 0, mean = 0;
};
Gains gains_of(const Sheath& sheath, double transit_s) {
    constexpr double slowest = 0.03, fastest = 120, weakest = 0.02;
    const auto parts = components_of(sheath.voltage);
    const double entry = entry_energy_ev(sheath) / sheath.voltage.mean();
    Gains gains;
    double top = 0;
    for (std::size_t k = 1; k <= sheath.voltage.volt.size() / 2; ++k) {
        const double omega_tau = 2 * pi * double(k) / sheath.voltage.period_s * transit_s;
        const double swing = 2 * std::abs(parts[k]) / parts[0].real();
        if (omega_tau > fastest || swing < weakest) continue;
        gains.middle += (1 + entry) * swing * swing * shape_at(omega_tau).middle;
        top = omega_tau;
    }
    if (top > slowest)
        gains.mean = (1 + entry) * mean_gain(sheath.voltage, transit_s, top, entry,
                                             sheath.profile_power, sheath.edge);
    return gains;
}

/// Shares of the bins when arrivals at high energy weigh more, by a power of the energy such that
/// the mean becomes `wanted`: few ions stay slow in a sheath that gives more later.
std::vector<double> bunched(const std::vector<double>& share, const std::vector<double>& edges,
                            double wanted) {
    std::vector<double> middle, result = share;
    for (std::size_t e = 0; e < share.size(); ++e)
        middle.push_back(0.5 * (edges[e] + edges[e + 1]));
    const auto mean_with = [&](double power) {
        double sum = 0, moment = 0;
        for (std::size_t e = 0; e < share.size(); ++e) {
            result[e] = share[e] * std::pow(middle[e] / wanted, power);
            sum += result[e];
            moment += result[e] * middle[e];
        }
        for (double& r : result)
            r /= sum;
        return moment / sum;
    };
    double low = -steepest, high = steepest;
    for (int i = 0; i < 40; ++i) {
        const double power = 0.5 * (low + high);
        (mean_with(power) < wanted ? low : high) = power;
    }
    return result;
}

} // namespace

double damping(double omega_tau, double limit) {
    return 1 / std::cbrt(1 + std::pow(omega_tau / limit, 3));
}

double damping_limit(const Sheath& sheath) {
    return sheath.edge == SheathEdge::moving ? 3 : 3 * sheath.profile_power;
}

Waveform damped_voltage(const Waveform& sheath_voltage, double transit_s, double limit) {
    require(std::isfinite(transit_s) && transit_s >= 0, "a transit time must not be negative");
    require(limit > 0, "the limit of the damping must be above zero");
    if (sheath_voltage.is_steady()) return sheath_voltage;
    require(sheath_voltage.period_s > 0, "a swinging voltage needs a period above zero");
    return filtered(sheath_voltage, transit_s,
                    [&](double omega_tau) { return damping(omega_tau, limit); });
}

Waveform relaxed_voltage(const Waveform& sheath_voltage, double relaxation_s) {
    require(std::isfinite(relaxation_s) && relaxation_s >= 0,
            "a relaxation time must not be negative");
    if (sheath_voltage.is_steady() || relaxation_s == 0) return sheath_voltage;
    const std::vector<double>& v = sheath_voltage.volt;
    const std::size_t count = v.size();
    const double step = sheath_voltage.period_s / double(count) / relaxation_s;
    const double kept = std::exp(-step), from = -std::expm1(-step);
    // Over a straight piece from a to b: kept Vd + of_a a + of_b b.
    const double of_b = 1 - from / step, of_a = from - of_b;
    double value = 0, decay = 1;
    for (std::size_t i = 0; i < count; ++i) {
        value = kept * value + of_a * v[i] + of_b * v[(i + 1) % count];
        decay *= kept;
    }
    value /= 1 - decay; // the start that comes back after a period
    Waveform relaxed = sheath_voltage;
    for (std::size_t i = 0; i < count; ++i) {
        relaxed.volt[i] = value;
        value = kept * value + of_a * v[i] + of_b * v[(i + 1) % count];
    }
    return relaxed;
}

std::vector<double> time_shares(const Waveform& voltage, const std::vector<double>& edges) {
    require(edges.size() >= 2, "shares need at least two edges");
    const std::size_t count = voltage.volt.size(), bins = edges.size() - 1;
    std::vector<double> share(bins, 0.0);
    for (std::size_t i = 0; i < count; ++i) {
        const double a = voltage.volt[i], b = voltage.volt[(i + 1) % count];
        const double low = std::min(a, b), high = std::max(a, b);
        const auto above = std::upper_bound(edges.begin(), edges.end(), low);
        std::size_t bin = above == edges.begin() ? 0 : std::size_t(above - edges.begin()) - 1;
        if (!(high > low)) {
            // On the last edge itself: the last bin.
            if (low == edges.back()) bin = bins - 1;
            if (low >= edges.front() && low <= edges.back()) share[bin] += 1.0 / double(count);
            continue;
        }
        for (; bin < bins && edges[bin] < high; ++bin) {
            const double part = std::min(high, edges[bin + 1]) - std::max(low, edges[bin]);
            if (part > 0) share[bin] += part / (high - low) / double(count);
        }
    }
    return share;
}

IonDistribution damped_arrival(const Sheath& sheath, const SheathIon& ion, double gain) {
    const double mean = sheath.voltage.mean();
    const double entry = entry_energy_ev(sheath) + ion.transverse_ev; // as warm along the normal
    require(std::isfinite(mean) && mean > 0, "the mean voltage across a sheath must be above zero");
    require(sheath.voltage.lowest() >= 0, "the voltage across a sheath must not be negative");
    require(sheath.thickness_nm > 0, "a sheath thickness must be above zero");
    const IonDistribution steady = IonDistribution::thermal_fall(
        mean + entry_energy_ev(sheath), ion.transverse_ev, ion.transverse_ev);
    if (sheath.voltage.is_steady()) return steady;
    const double transit = transit_time_s(sheath, ion.mass_amu);
    const Gains gains = gains_of(sheath, transit);
    const double limit = damping_limit(sheath);
    const bool child =
        sheath.edge == SheathEdge::fixed && std::fabs(sheath.profile_power - 4 / 3.) < 1e-9;
    Waveform energy = filtered(sheath.voltage, transit, [&](double omega_tau) {
        const double width = child ? shape_at(omega_tau).width : 1;
        return width * damping(omega_tau, limit);
    });
    // A step overshoots by up to 1 %, which no ion can.
    const double bottom = sheath.voltage.lowest(), top = sheath.voltage.highest();
    for (double& v : energy.volt)
        v = std::clamp(v, bottom, top);
    energy = energy.raised_by(entry + gains.middle * mean);
    const double low = energy.lowest(), high = energy.highest();
    const double all = high - low;
    if (!(all > 1e-6 * high)) return steady;
    std::vector<double> edges;
    for (int e = 0; e <= energy_bins; ++e)
        edges.push_back(low + all * e / energy_bins);
    edges.back() = high;
    const double wanted = gain * (mean + entry + gains.mean * mean);
    return IonDistribution::falling_spectrum(
        edges, bunched(time_shares(energy, edges), edges, wanted), ion.transverse_ev);
}

} // namespace rille::fluxes
