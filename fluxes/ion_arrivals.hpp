// SPDX-License-Identifier: Apache-2.0
// Private to fluxes: the ions' part of solve_surface.
#pragma once

#include "fluxes/direct_ions.hpp"
#include "fluxes/reflected_ions.hpp"
#include "fluxes/surface_step.hpp"
#include "fluxes/tally_sums.hpp"

#include <tbb/blocked_range.h>
#include <tbb/parallel_for.h>

#include <chrono>
#include <memory>
#include <vector>

namespace rille::fluxes {

/// Calls `body` with ranges of elements.
template <typename Body>
void for_elements(std::size_t n, const Body& body) {
    tbb::parallel_for(tbb::blocked_range<int>(0, static_cast<int>(n), 32), body);
}

/// Wall time by part; one part goes on until the next begins.
class PartClock {
public:
    using Part = double SurfaceStep::Seconds::*;
    void begin(Part part) {
        const auto now = std::chrono::steady_clock::now();
        if (part_) seconds_.*part_ += std::chrono::duration<double>(now - start_).count();
        part_ = part;
        start_ = now;
    }
    /// Ends the last part.
    SurfaceStep::Seconds stop() {
        begin(nullptr);
        return seconds_;
    }

private:
    SurfaceStep::Seconds seconds_;
    Part part_ = nullptr;
    std::chrono::steady_clock::time_point start_;
};

/// What a step is asked about.
struct Setting {
    const geometry::Domain& domain;
    const geometry::Surface& surface;
    const geometry::RayCaster& caster;
    const MaterialsInReach& reach;
    const Mechanism& mechanism;
    const Sources& sources;
    const Sampling& sampling;
    mutable PartClock clock{};

    int outermost(int e) const { return reach.outermost(e); }
};

/// Everything ions bring to the elements at their own normals, as the sums that act on the
/// outermost material.
struct IonArrivals {
    std::shared_ptr<const IonTables> tables;
    TallySums sums;
    /// Of each sum wanted of the transport: the sum that it adds to. First come those by ions,
    /// one for one, then those by fast neutrals.
    std::vector<int> adds_to;
    std::unique_ptr<DirectIons> direct;
    ReflectedIons reflected;
    int tallies = 0;             ///< of the mechanism by sums
    std::vector<double> by_path; ///< [(element * ion_paths + path) * tallies + m], if asked for
    std::vector<std::vector<double>> by_path_batch; ///< [batch], where they are asked for
    std::vector<double> bounced; ///< [element][sum]: reflected, of all materials in reach
    std::vector<double> total;   ///< [element][tally], direct and reflected
    std::vector<std::vector<double>> batch; ///< [batch][element][tally]: the same of one batch

    const double* at(int element, int b) const {
        return (b < 0 ? total : batch[b]).data() + std::size_t(element) * tallies;
    }
    /// Gives back what is kept at the elements' own normals, which rates over angles do not need.
    void forget_own_normals() {
        by_path = std::vector<double>(); // {} would keep the memory
        by_path_batch = std::vector<std::vector<double>>();
        total = std::vector<double>();
        batch = std::vector<std::vector<double>>();
    }
    bool by_fast_neutrals(int wanted) const { return wanted >= int(sums.members.size()); }
};

IonArrivals gather_ions(const Setting&, const std::vector<IonReflection>&,
                        const SurfaceStep* previous);

} // namespace rille::fluxes
