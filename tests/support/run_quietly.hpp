// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/run.hpp"
#include "fluxes/yields.hpp"
#include "tests/support/trench_case.hpp"

namespace rille::tests {

/// The whole run, told to nobody.
inline engine::RunResult run_quietly(const engine::Case& c) {
    struct Silent : engine::RunObserver {
        void progressed(const engine::Simulation&, const engine::HistoryRow&, double) override {}
        void framed(const engine::SurfaceState&) override {}
    } silent;
    const std::atomic<bool> stop{false};
    return engine::run_case(c, silent, stop);
}

inline fluxes::YieldFunction flat_yield(double value) {
    return {fluxes::ConstantLaw{value}, fluxes::FlatAngle{}, 1.0};
}

/// `material` etched by ions alone with this yield; density 50 nm^-3.
inline void etch_by_ions(TrenchCase& t, int material, const fluxes::YieldFunction& yield) {
    t.chemistry(material).density = 50;
    t.chemistry(material).processes = {fluxes::PhysicalSputtering{{}, {t.add_tally(yield)}}};
}

inline fluxes::IonDistribution straight_down() {
    return fluxes::IonDistribution::beam(100, geometry::Vec3(0, 0, -1));
}

} // namespace rille::tests
