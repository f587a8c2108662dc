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

void require(bool condition, const char* message) {
    if (!condition) throw std::invalid_argument(message);
}

std::vector<std::complex<double>> components_of(const Waveform& voltage) {
    Eigen::FFT<double> transform;
    std::vector<std::complex<double>> parts;
    transform.fwd(parts, voltage.volt);
    return parts;
}

/// Where the middle of the spectrum of one sine lies above mean voltage and entry energy, over the
/// square of the swing: trajectories in a Child sheath of fixed width, entry energies of 0.0005 to
/// 0.05 of the mean voltage, swings of 0.5 and 1, rounded to their common course.
double middle_gain(double omega_tau) {
    struct Point {
        double omega_tau, gain;
    };
    static constexpr Point table[] = {
        {0, 0},     {0.3, 0.004}, {1, 0.022},  {2, 0.050},  {3, 0.074},  {4, 0.086},  {5, 0.080},
        {6, 0.062}, {8, 0.030},   {10, 0.019}, {15, 0.009}, {20, 0.005}, {30, 0.002}, {60, 0.0}};
    if (omega_tau >= std::end(table)[-1].omega_tau) return 0;
    const Point* high = std::upper_bound(std::begin(table), std::end(table), omega_tau,
                                         [](double x, const Point& p) { return x < p.omega_tau; });
    const Point& low = high[-1];
    return low.gain + (high->gain - low.gain) * (omega_tau - low.omega_tau) /
                          (high->omega_tau - low.omega_tau);
}

/// Sine parts that matter for the mean: swing over the mean voltage and frequency.
struct Swing {
    double ratio, omega_tau;
};
std::vector<Swing> strong_swings(const Waveform& voltage, double transit_s) {
    constexpr std::size_t most = 12;
    constexpr double slowest = 0.1, fastest = 120, weakest = 0.02;
    const auto parts = components_of(voltage);
    std::vector<Swing> swings;
    for (std::size_t k = 1; k <= voltage.volt.size() / 2; ++k) {
        const double omega_tau = 2 * pi * double(k) / voltage.period_s * transit_s;
        const double ratio = 2 * std::abs(parts[k]) / parts[0].real();
        if (omega_tau > slowest && omega_tau < fastest && ratio > weakest)
            swings.push_back({ratio, omega_tau});
    }
    std::stable_sort(swings.begin(), swings.end(),
                     [](const Swing& a, const Swing& b) { return a.ratio > b.ratio; });
    if (swings.size() > most) swings.resize(most);
    return swings;
}

/// Shift of the middle and gain of the mean, both over the mean voltage.
struct Gains {
    double middle = 0, mean = 0;
};
Gains gains_of(const Sheath& sheath, double transit_s) {
    Gains gains;
    const double entry = entry_energy_ev(sheath) / sheath.voltage.mean();
    for (const Swing& swing : strong_swings(sheath.voltage, transit_s)) {
        const double held = std::min(swing.ratio, 1.0), more = swing.ratio / held;
        gains.mean += more * more * (1 + entry) *
                      mean_gain(swing.omega_tau, held, entry, sheath.profile_power, sheath.edge);
        gains.middle += (1 + entry) * swing.ratio * swing.ratio * middle_gain(swing.omega_tau);
    }
    return gains;
}

/// Shares of the bins when arrivals at high energy weigh more: 1 + b (E - mean), with b such that
/// the mean becomes `wanted`. No arrival weighs less than nothing.
std::vector<double> bunched(const std::vector<double>& share, const std::vector<double>& edges,
                            double wanted) {
    double mean = 0, square = 0;
    std::vector<double> middle;
    for (std::size_t e = 0; e < share.size(); ++e) {
        middle.push_back(0.5 * (edges[e] + edges[e + 1]));
        mean += share[e] * middle[e];
    }
    for (std::size_t e = 0; e < share.size(); ++e)
        square += share[e] * (middle[e] - mean) * (middle[e] - mean);
    if (!(square > 0)) return share;
    std::vector<double> result(share.size());
    double slope = (wanted - mean) / square;
    // A cut at zero weakens the shift; a few rounds bring it back.
    for (int round = 0; round < 20; ++round) {
        double sum = 0, moment = 0;
        for (std::size_t e = 0; e < share.size(); ++e) {
            result[e] = share[e] * std::max(0.0, 1 + slope * (middle[e] - mean));
            sum += result[e];
            moment += result[e] * middle[e];
        }
        for (double& r : result)
            r /= sum;
        const double missing = wanted - moment / sum;
        if (std::fabs(missing) < 1e-6 * mean) break;
        slope += missing / square;
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
    auto parts = components_of(sheath_voltage);
    const std::size_t count = parts.size();
    for (std::size_t k = 1; k < count; ++k) {
        const double cycles = double(std::min(k, count - k));
        parts[k] *= damping(2 * pi * cycles / sheath_voltage.period_s * transit_s, limit);
    }
    Waveform damped = sheath_voltage;
    Eigen::FFT<double> transform;
    transform.inv(damped.volt, parts);
    return damped;
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

IonDistribution damped_arrival(const Sheath& sheath, const SheathIon& ion) {
    const double mean = sheath.voltage.mean(), entry = entry_energy_ev(sheath);
    require(std::isfinite(mean) && mean > 0, "the mean voltage across a sheath must be above zero");
    require(sheath.thickness_nm > 0, "a sheath thickness must be above zero");
    if (sheath.voltage.is_steady())
        return IonDistribution::thermal_fall(mean + entry, ion.transverse_ev, 0);
    const double transit = transit_time_s(sheath, ion.mass_amu);
    const Gains gains = gains_of(sheath, transit);
    const Waveform energy = damped_voltage(sheath.voltage, transit, damping_limit(sheath))
                                .raised_by(entry + gains.middle * mean);
    const double low = std::max(0.0, energy.lowest()), high = energy.highest();
    const double all = high - low;
    if (!(all > 1e-6 * high))
        return IonDistribution::thermal_fall(mean + entry, ion.transverse_ev, 0);
    std::vector<double> edges;
    for (int e = 0; e <= energy_bins; ++e)
        edges.push_back(low + all * e / energy_bins);
    edges.back() = high;
    const double wanted = mean + entry + gains.mean * mean;
    return IonDistribution::falling_spectrum(
        edges, bunched(time_shares(energy, edges), edges, wanted), ion.transverse_ev);
}

} // namespace rille::fluxes
