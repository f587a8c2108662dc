// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "fluxes/octave_table.hpp"
#include "fluxes/sheath.hpp"

#include <vector>

namespace rille::fluxes {

/// The field of a sheath as an ion of one mass feels it, made for speed: y is the way from the edge
/// (of the widest sheath) in units of its width, 1 at the wafer; time counts in units of the fall
/// scale, in which an ion of the mean voltage's energy moves by y = 1; speeds are in y per that.
/// So the energy of a speed is u^2 * mean voltage [eV].
class SheathField {
public:
    /// Throws std::invalid_argument on a sheath or mass that cannot be.
    SheathField(const Sheath&, double mass_amu);

    bool steady() const { return steady_; }
    double mean_voltage() const { return mean_v_; }
    double width_nm() const { return width_nm_; }
    /// Longest steps that resolve the fall and the voltage.
    double longest_step() const { return longest_step_; }
    double period() const { return period_; } ///< 0 if steady
    /// Of the period, [0, 1).
    float phase(double time) const {
        const double turns = time * phase_per_time_;
        const auto part =
            static_cast<float>(turns - static_cast<double>(static_cast<long long>(turns)));
        return part < 1 ? part : 0.0f; // rounding up meets the next period
    }
    /// Where flights begin: so near the edge that the field up to there gives them nothing.
    double first_y() const { return moving_ ? 0.0 : 1e-4; }
    /// Way from y over which the field stays of one size.
    double room(double y) const { return moving_ ? 0.25 : 1e-4 + y; }

    double energy_ev(double speed_squared) const { return mean_v_ * speed_squared; }
    double speed_squared(double energy_ev) const { return energy_ev / mean_v_; }

    /// Acceleration at `time`, from 0 on, and place y.
    double pull(double time, double y) const {
        const double s = swing(time);
        if (moving_) {
            const double depth = y - s; // below the edge of this moment
            return depth > 0 ? depth * strength_ : 0.0;
        }
        return s * shape_(y);
    }
    /// Energy gained from the edge to y in a steady field [eV].
    double steady_gain_ev(double y) const;
    /// Where a steady field has given so much.
    double steady_place(double gain_ev) const;
    /// Energy gained from the edge to a small y that is crossed at `time` [eV].
    double entry_gain_ev(double time, double y) const;

private:
    double swing(double time) const {
        if (steady_) return swing_.front();
        double phase = time * phase_per_time_;
        phase -= static_cast<double>(static_cast<long long>(phase));
        const double place = phase * samples_;
        const int i = static_cast<int>(place);
        return swing_[i] + (place - i) * (swing_[i + 1] - swing_[i]);
    }

    bool steady_ = true, moving_ = false;
    double power_ = 2, mean_v_ = 0, width_nm_ = 0, strength_ = 0;
    double period_ = 0, phase_per_time_ = 0, samples_ = 1, longest_step_ = 0;
    OctaveTable shape_;         ///< of a fixed edge: y^(m - 1)
    std::vector<double> swing_; ///< fixed: m V / (2 mean V); moving: y of the edge; two ends equal
};

} // namespace rille::fluxes
