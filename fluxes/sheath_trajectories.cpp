// SPDX-License-Identifier: Apache-2.0
#include "fluxes/sheath_trajectories.hpp"

#include "fluxes/encounters.hpp"
#include "fluxes/sheath_fall.hpp"
#include "fluxes/sheath_field.hpp"

#include <tbb/parallel_for.h>

#include <algorithm>
#include <cmath>
#include <stdexcept>

namespace rille::fluxes {
namespace {

constexpr int batches = 8, ions_per_chunk = 256;

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
        : field_(field), encounters_(encounters), fall_(field, encounters), draws_(draws),
          tally_(tally) {
        enter(sheath, ion);
    }

    Arrival follow() {
        for (;;) {
            const SheathFall::Move move = fall_.next(1);
            if (move.depth > depth_left_ && !encounters_.none()) {
                fall_.take_part(move, depth_left_ / move.depth);
                collide();
                continue;
            }
            depth_left_ -= move.depth;
            fall_.take(move);
            if (move.reached) return arrive();
        }
    }

private:
    /// Flux-weighted Maxwellian that has fallen through the presheath: the energy across and the
    /// excess along the normal are independent exponentials.
    void enter(const Sheath& sheath, const SheathIon& ion) {
        const auto a = draws_.pair(), b = draws_.pair();
        const double time = a[0] * field_.period();
        depth_left_ = -std::log1p(-a[1]);
        const double along_ev = entry_energy_ev(sheath) - ion.transverse_ev * std::log1p(-b[0]);
        const double across_ev = -ion.transverse_ev * std::log1p(-b[1]);
        energy_in_ = along_ev + across_ev;
        // The field rises from zero with an infinite slope, so the first bit is crossed at once.
        const double y = field_.first_y();
        const double start_ev = along_ev + field_.entry_gain_ev(time, y);
        fall_.start(time, y,
                    {std::sqrt(field_.speed_squared(start_ev)),
                     std::sqrt(field_.speed_squared(across_ev))});
        if (!encounters_.none()) depth_left_ -= y * encounters_.rate(energy_in_);
    }

    void collide() {
        fall_.settle_energy();
        const auto u = draws_.pair();
        depth_left_ = -std::log1p(-u[0]);
        const Encounters::Outcome outcome = encounters_.meet(fall_.velocity(), u[1], draws_);
        energy_in_ += outcome.thermal_ev;
        energy_out_ += outcome.recoil_ev;
        if (outcome.exchange) leave_neutral();
        fall_.restart(outcome.ion);
    }

    /// Neutrals feel no field; those that leave for the plasma are lost.
    void leave_neutral() {
        ++tally_.exchanges;
        const double energy = fall_.energy_ev();
        const Encounters::Velocity& velocity = fall_.velocity();
        energy_out_ += energy;
        if (!(velocity.along > 0)) return;
        const double later = fall_.time() + (1 - fall_.y()) / velocity.along;
        tally_.fast_neutrals.push_back(
            {energy, velocity.across / velocity.along, field_.phase(later)});
    }

    Arrival arrive() {
        fall_.land();
        const double energy = fall_.energy_ev();
        if (field_.steady()) {
            energy_in_ += field_.steady_gain_ev(1);
            const double defect = std::fabs(energy_out_ + energy - energy_in_) / energy_in_;
            tally_.defect = std::max(tally_.defect, defect);
        }
        return {energy, fall_.velocity().across / fall_.velocity().along,
                field_.phase(fall_.time())};
    }

    const SheathField& field_;
    const Encounters& encounters_;
    SheathFall fall_;
    Draws draws_;
    Tally& tally_;
    double depth_left_ = 0; ///< expected collisions before the next one
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
