// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "fluxes/octave_table.hpp"
#include "fluxes/sampling.hpp"
#include "fluxes/sheath_field.hpp"

#include <array>
#include <vector>

namespace rille::fluxes {

/// The random numbers of one ion, in pairs of its own stream, as many as its fate asks for.
class Draws {
public:
    Draws(std::uint64_t key, std::uint32_t index) : points_(key), index_(index) {}
    std::array<double, 2> pair() { return points_.pair(index_, next_++); }

private:
    ScrambledPoints points_;
    std::uint32_t index_;
    int next_ = 0;
};

/// What an ion can meet in the gas, in the units of a SheathField. Velocities have a part along the
/// normal, above zero towards the wafer, and one across it; nothing prefers an azimuth, so the
/// latter needs its size alone.
class Encounters {
public:
    struct Velocity {
        double along = 0, across = 0;
        double squared() const { return along * along + across * across; }
    };
    struct Outcome {
        bool exchange = false;
        Velocity ion;          ///< what flies on
        double thermal_ev = 0; ///< brought in by the gas
        double recoil_ev = 0;  ///< carried off by the struck molecule, if not `exchange`
    };

    /// Throws std::invalid_argument on a process that cannot be, and on charge exchange with a gas
    /// whose mass differs from the ion's by more than 2 %: another ion would fly on.
    Encounters(const SheathIon&, const SheathField&);

    bool none() const { return process_.empty(); }
    /// Collisions per y of flight path at the ion's energy.
    double rate(double energy_ev) const { return total_(energy_ev); }
    /// The same of the processes of one kind.
    double rate_of(CollisionProcess::Kind, double energy_ev) const;
    /// An isotropic collision with gas at rest, for ions that fly along the normal: `choice` in
    /// [0, 1) picks the process, `cosine` is that of the deflection in the frame of the centre of
    /// mass.
    Velocity deflected(const Velocity& ion, double choice, double cosine) const;
    /// One collision; `choice` in [0, 1) picks the process.
    Outcome meet(const Velocity& ion, double choice, Draws& draws) const;

private:
    struct Process {
        CollisionProcess::Kind kind;
        double mass_ratio;    ///< gas over ion
        double thermal_speed; ///< standard deviation of one component of the gas
        OctaveTable rate;
    };
    const Process& pick(double energy_ev, double choice) const;

    double mean_voltage_ = 1;
    std::vector<Process> process_;
    OctaveTable total_;
};

} // namespace rille::fluxes
