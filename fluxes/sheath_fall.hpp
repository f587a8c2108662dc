// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "fluxes/encounters.hpp"
#include "fluxes/sheath_field.hpp"

#include <algorithm>
#include <cmath>

namespace rille::fluxes {

/// An ion on its way through a sheath, in steps of fourth order, and the collisions to expect on
/// them; whether they come is for others to say. Units of the SheathField.
class SheathFall {
public:
    using Velocity = Encounters::Velocity;

    /// A step that was not taken yet.
    struct Move {
        double first, length;    ///< pull at its begin; time
        double y, along, middle; ///< place and normal speed at its end, the speed half way
        double depth, end_rate;  ///< expected collisions in it; their rate at its end
        bool reached;            ///< it ends on the place that was asked for
    };

    SheathFall(const SheathField& field, const Encounters& encounters)
        : field_(field), encounters_(encounters) {}

    void start(double time, double y, const Velocity& velocity) {
        time_ = time;
        y_ = y;
        restart(velocity);
    }
    /// Goes on from here with another velocity.
    void restart(const Velocity& velocity) {
        velocity_ = velocity;
        start_y_ = y_;
        start_ev_ = field_.energy_ev(velocity.along * velocity.along);
        rate_ = encounters_.none() ? 0 : rate_of_time(velocity_.along);
    }

    double time() const { return time_; }
    double y() const { return y_; }
    const Velocity& velocity() const { return velocity_; }
    double energy_ev() const { return field_.energy_ev(velocity_.squared()); }

    /// The next step; it ends on `target` (beyond the ion, at most 1) rather than past it.
    Move next(double target) const {
        const double first = field_.pull(time_, y_);
        Move move = nystrom(first, step_length(first));
        move.reached = move.y >= target;
        if (move.reached) move = cut_to(target, move);
        if (encounters_.none()) return move;
        move.end_rate = rate_of_time(move.along);
        move.depth = move.length / 6 * (rate_ + 4 * rate_of_time(move.middle) + move.end_rate);
        return move;
    }
    void take(const Move& move) {
        time_ += move.length;
        y_ = move.y;
        velocity_.along = move.along;
        rate_ = move.end_rate;
        if (y_ >= 0) return;
        y_ = -y_; // the presheath sends back what leaves the sheath
        velocity_.along = -velocity_.along;
    }
    /// Up to where `share` of its expected collisions have come; the rate is taken as straight.
    void take_part(const Move& move, double share) {
        const double wanted = std::max(share, 0.0) * (rate_ + move.end_rate);
        const double root = std::sqrt(rate_ * rate_ + (move.end_rate - rate_) * wanted);
        const double part = wanted > 0 ? std::min(1.0, wanted / (rate_ + root)) : 0.0;
        take(nystrom(move.first, move.length * part));
        y_ = std::min(y_, 1.0);
    }
    /// All the steps to `target`; returns the collisions to expect on the way.
    double fall_to(double target) {
        for (double depth = 0;;) {
            const Move move = next(target);
            depth += move.depth;
            take(move);
            if (!move.reached) continue;
            y_ = target;
            settle_energy();
            return depth;
        }
    }

    /// In a steady field the energy follows from the place alone.
    void settle_energy() {
        if (!field_.steady()) return;
        const double start_gain_ev = field_.steady_gain_ev(start_y_);
        double ev = start_ev_ + field_.steady_gain_ev(y_) - start_gain_ev;
        if (ev < 0) { // the last step of an ion that turns back went a hair too far
            ev = 0;
            y_ = field_.steady_place(start_gain_ev - start_ev_);
        }
        velocity_.along = std::copysign(std::sqrt(field_.speed_squared(ev)), velocity_.along);
    }
    /// The wafer is reached: to round-off.
    void land() {
        y_ = 1;
        settle_energy();
    }

private:
    /// Step for a pull that does not depend on the speed (Nystrom).
    Move nystrom(double first, double h) const {
        const double half = 0.5 * h, along = velocity_.along;
        const double second = field_.pull(time_ + half, y_ + half * (along + 0.25 * h * first));
        const double third = field_.pull(time_ + h, y_ + h * (along + half * second));
        return {first,
                h,
                y_ + h * (along + h / 6 * (first + 2 * second)),
                along + h / 6 * (first + 4 * second + third),
                along + 0.25 * h * (first + second),
                0,
                0,
                false};
    }
    /// Long enough for the voltage and the fall, and never across a large change of the field.
    double step_length(double first) const {
        double h = field_.longest_step();
        const double room = field_.room(y_);
        while (h * (std::fabs(velocity_.along) + 0.5 * h * first) > room)
            h *= 0.5;
        return h;
    }
    /// Shortens a step that passed `target` so that it ends there: the root for the mean pull of
    /// the whole step, then Newton's method.
    Move cut_to(double target, Move move) const {
        const double left = target - y_, along = velocity_.along, h = move.length;
        const double twice_pull = 4 * (move.y - y_ - along * h) / (h * h);
        double cut =
            2 * left / (along + std::sqrt(std::max(along * along + twice_pull * left, 0.0)));
        for (int i = 0; i < 2; ++i) {
            move = nystrom(move.first, cut);
            cut -= (move.y - target) / move.along;
        }
        move = nystrom(move.first, cut);
        move.reached = true;
        return move;
    }
    double rate_of_time(double along) const {
        const double squared = along * along + velocity_.across * velocity_.across;
        return std::sqrt(squared) * encounters_.rate(field_.energy_ev(squared));
    }

    const SheathField& field_;
    const Encounters& encounters_;
    double time_ = 0, y_ = 0;
    double rate_ = 0; ///< of collisions per time, here
    Velocity velocity_;
    double start_y_ = 0, start_ev_ = 0; ///< where the normal motion last changed by a collision
};

} // namespace rille::fluxes
