// SPDX-License-Identifier: Apache-2.0
#include "fluxes/sheath_trajectories.hpp"

#include "fluxes/encounters.hpp"
#include "fluxes/sheath_field.hpp"

#include <tbb/parallel_for.h>

#include <algorithm>
#include <cmath>
#include <stdexcept>

namespace rille::fluxes {
namespace {

constexpr int batches = 8, ions_per_chunk = 256;

/// Place and normal speed after a step, and the speed half way.
struct Step {
    double y, along, middle;
};

/// Fourth-order step for a pull that does not depend on the speed (Nystrom).
Step nystrom(const SheathField& field, double time, double y, double along, double first,
             double h) {
    const double half = 0.5 * h;
    const double second = field.pull(time + half, y + half * (along + 0.25 * h * first));
    const double third = field.pull(time + h, y + h * (along + half * second));
    return {y + h * (along + h / 6 * (first + 2 * second)),
            along + h / 6 * (first + 4 * second + third), along + 0.25 * h * (first + second)};
}

/// What the ions of one chunk left behind.
struct Tally {
    std::vector<Arrival> fast_neutrals;
    std::int64_t exchanges = 0;
    double defect = 0;
};

/// One ion on its way.
class Flight {
public:
    Flight(const Sheath& sheath, const SheathIon& ion, const SheathField& field,
           const Encounters& encounters, Draws draws, Tally& tally)
        : field_(field), encounters_(encounters), draws_(draws), tally_(tally) {
        enter(sheath, ion);
    }

    Arrival follow() {
        for (;;) {
            const double first = field_.pull(time_, y_);
            double h = step_length(first);
            Step step = nystrom(field_, time_, y_, velocity_.along, first, h);
            const bool reached = step.y >= 1;
            if (reached) h = reach_wafer(first, h, step);
            if (!encounters_.none()) {
                const double end_rate = rate_of_time(step.along);
                const double depth = depth_of(step, end_rate, h);
                if (depth > depth_left_) {
                    collide(first, h * part_before(depth_left_ / depth, end_rate));
                    continue;
                }
                depth_left_ -= depth;
                rate_ = end_rate;
            }
            move(step, h);
            if (reached) return arrive();
        }
    }

private:
    /// Flux-weighted Maxwellian that has fallen through the presheath: the energy across and the
    /// excess along the normal are independent exponentials.
    void enter(const Sheath& sheath, const SheathIon& ion) {
        const auto a = draws_.pair(), b = draws_.pair();
        time_ = a[0] * field_.period();
        depth_left_ = -std::log1p(-a[1]);
        const double along_ev = entry_energy_ev(sheath) - ion.transverse_ev * std::log1p(-b[0]);
        const double across_ev = -ion.transverse_ev * std::log1p(-b[1]);
        velocity_.across = std::sqrt(field_.speed_squared(across_ev));
        energy_in_ = along_ev + across_ev;
        // The field rises from zero with an infinite slope, so the first bit is crossed at once.
        y_ = field_.first_y();
        start_y_ = y_;
        start_ev_ = along_ev + field_.entry_gain_ev(time_, y_);
        velocity_.along = std::sqrt(field_.speed_squared(start_ev_));
        if (encounters_.none()) return;
        depth_left_ -= y_ * encounters_.rate(energy_in_);
        rate_ = rate_of_time(velocity_.along);
    }

    /// Long enough for the voltage and the fall, and never across a large change of the field.
    double step_length(double first) const {
        double h = field_.longest_step();
        const double room = field_.room(y_);
        while (h * (std::fabs(velocity_.along) + 0.5 * h * first) > room)
            h *= 0.5;
        return h;
    }

    /// Shortens a step that passed the wafer so that it ends on it, and returns its length: the
    /// root for the mean pull of the whole step, then Newton's method.
    double reach_wafer(double first, double h, Step& step) const {
        const double left = 1 - y_, along = velocity_.along;
        const double twice_pull = 4 * (step.y - y_ - along * h) / (h * h);
        double cut =
            2 * left / (along + std::sqrt(std::max(along * along + twice_pull * left, 0.0)));
        for (int i = 0; i < 2; ++i) {
            step = nystrom(field_, time_, y_, along, first, cut);
            cut -= (step.y - 1) / step.along;
        }
        step = nystrom(field_, time_, y_, along, first, cut);
        return cut;
    }

    double rate_of_time(double along) const {
        const double squared = along * along + velocity_.across * velocity_.across;
        return std::sqrt(squared) * encounters_.rate(field_.energy_ev(squared));
    }
    /// Expected collisions in a step, by Simpson's rule.
    double depth_of(const Step& step, double end_rate, double h) const {
        return h / 6 * (rate_ + 4 * rate_of_time(step.middle) + end_rate);
    }
    /// Part of the step at which `share` of its expected collisions have come; the rate of time is
    /// taken as straight between the ends.
    double part_before(double share, double end_rate) const {
        const double wanted = std::max(share, 0.0) * (rate_ + end_rate);
        const double root = std::sqrt(rate_ * rate_ + (end_rate - rate_) * wanted);
        return wanted > 0 ? std::min(1.0, wanted / (rate_ + root)) : 0.0;
    }

    void move(const Step& step, double h) {
        time_ += h;
        y_ = step.y;
        velocity_.along = step.along;
        if (y_ >= 0) return;
        y_ = -y_; // the presheath sends back what leaves the sheath
        velocity_.along = -velocity_.along;
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

    void collide(double first, double h) {
        move(nystrom(field_, time_, y_, velocity_.along, first, h), h);
        y_ = std::min(y_, 1.0);
        settle_energy();
        const auto u = draws_.pair();
        depth_left_ = -std::log1p(-u[0]);
        const Encounters::Outcome outcome = encounters_.meet(velocity_, u[1], draws_);
        energy_in_ += outcome.thermal_ev;
        energy_out_ += outcome.recoil_ev;
        if (outcome.exchange) leave_neutral();
        velocity_ = outcome.ion;
        start_y_ = y_;
        start_ev_ = field_.energy_ev(velocity_.along * velocity_.along);
        rate_ = rate_of_time(velocity_.along);
    }

    /// Neutrals feel no field; those that leave for the plasma are lost.
    void leave_neutral() {
        ++tally_.exchanges;
        const double energy = field_.energy_ev(velocity_.squared());
        energy_out_ += energy;
        if (!(velocity_.along > 0)) return;
        const double later = time_ + (1 - y_) / velocity_.along;
        tally_.fast_neutrals.push_back(
            {energy, velocity_.across / velocity_.along, field_.phase(later)});
    }

    Arrival arrive() {
        y_ = 1;
        settle_energy();
        const double energy = field_.energy_ev(velocity_.squared());
        if (field_.steady()) {
            energy_in_ += field_.steady_gain_ev(1);
            const double defect = std::fabs(energy_out_ + energy - energy_in_) / energy_in_;
            tally_.defect = std::max(tally_.defect, defect);
        }
        return {energy, velocity_.across / velocity_.along, field_.phase(time_)};
    }

    const SheathField& field_;
    const Encounters& encounters_;
    Draws draws_;
    Tally& tally_;
    double time_ = 0, y_ = 0;
    double depth_left_ = 0; ///< expected collisions before the next one
    double rate_ = 0;       ///< of collisions per time, here
    Encounters::Velocity velocity_;
    double start_y_ = 0, start_ev_ = 0; ///< where the normal motion last changed by a collision
    double energy_in_ = 0, energy_out_ = 0;
};

} // namespace

Arrivals follow_ions(const Sheath& sheath, const SheathIon& ion,
                     const TrajectorySampling& sampling) {
    const SheathField field(sheath, ion.mass_amu);
    const Encounters encounters(ion, field);
    if (!(std::isfinite(ion.transverse_ev) && ion.transverse_ev >= 0 &&
          std::isfinite(sheath.electron_temperature_ev) && sheath.electron_temperature_ev >= 0))
        throw std::invalid_argument("temperatures at the sheath edge must not be negative");
    if (!(entry_energy_ev(sheath) + ion.transverse_ev > 0) && !field.steady())
        throw std::invalid_argument("ions must enter a changing sheath with some energy");
    if (sampling.ions < 1 || sampling.ions > (1 << 27))
        throw std::invalid_argument("the number of ions to follow must be 1 to 2^27");

    const int per_batch = (sampling.ions + batches - 1) / batches;
    const int chunks = (per_batch + ions_per_chunk - 1) / ions_per_chunk;
    Arrivals arrivals;
    arrivals.ions.resize(std::size_t(per_batch) * batches);
    std::vector<Tally> tallies(std::size_t(chunks) * batches);
    tbb::parallel_for(std::size_t(0), tallies.size(), [&](std::size_t c) {
        const int batch = static_cast<int>(c) / chunks;
        const int begin = static_cast<int>(c) % chunks * ions_per_chunk;
        const int end = std::min(begin + ions_per_chunk, per_batch);
        const std::uint64_t key = stream_key(sampling.seed, batch);
        for (int i = begin; i < end; ++i)
            arrivals.ions[std::size_t(batch) * per_batch + i] =
                Flight(sheath, ion, field, encounters, Draws(key, i), tallies[c]).follow();
    });
    std::int64_t exchanges = 0;
    for (const Tally& tally : tallies) {
        arrivals.fast_neutrals.insert(arrivals.fast_neutrals.end(), tally.fast_neutrals.begin(),
                                      tally.fast_neutrals.end());
        exchanges += tally.exchanges;
        arrivals.energy_defect = std::max(arrivals.energy_defect, tally.defect);
    }
    arrivals.exchanges_per_ion = double(exchanges) / double(arrivals.ions.size());
    return arrivals;
}

} // namespace rille::fluxes
