// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/case.hpp"
#include "engine/run_result.hpp"
#include "engine/run_state.hpp"
#include "engine/simulation.hpp"
#include "engine/surface_flux.hpp"

#include <atomic>
#include <functional>
#include <string>
#include <vector>

namespace rille::engine {

/// Told as the run goes on. Calls come from the run's own thread, in order.
class RunObserver {
public:
    virtual ~RunObserver() = default;
    /// After each refresh. `share` of the whole run that is done, in [0, 1], as far as can be told.
    virtual void progressed(const Simulation&, const HistoryRow&, double share) = 0;
    /// A frame: the front at a time of output, t = 0 and the end included.
    virtual void framed(const SurfaceState&) = 0;
    /// Arrivals and causes along the surface at a time that the case asks for.
    virtual void surveyed(const SurfaceFlux&) {}
    /// A warning raised at this point of the run; it is kept in the record as well.
    virtual void warned(const std::string&) {}
    /// After each refresh, when everything of it has been told: the run can be taken up from here.
    /// `frame_due`: a frame has just been written. `state()` makes the state, but for its frames.
    virtual void resumable(bool /*frame_due*/, const std::function<RunState()>& /*state*/) {}
};

/// Runs a case from its first step to its last, or until `stop` is set (seen after each refresh).
/// record.status tells which. Where the run fails the state before the failure is returned, with
/// status "failed" and the error.
RunResult run_case(const Case&, RunObserver&, const std::atomic<bool>& stop);
/// Takes up a run where `state` left it, and goes on to the same bits.
RunResult resume_case(const Case&, const RunState& state, RunObserver&,
                      const std::atomic<bool>& stop);

/// What the recipe is expected to do, from the open field: times as stated, and for steps that end
/// at a film the open field's time, at most the step's limit.
struct Expectation {
    std::vector<double> step_s; ///< length of each recipe step
    double total_s = 0;
    double depth_nm = 0;     ///< of the open field at the end
    double mask_loss_nm = 0; ///< flat loss of the mask at the end, at most its thickness
    /// Share of the whole that is done when `of_step` of step `index` is.
    double share(std::size_t index, double of_step) const;
};
Expectation expect(const Case&);
/// The same from a field that stands at its start; what it has solved before is not solved again.
Expectation expect(const Case&, OpenField);

/// Charging is not modelled: says so where it matters, an insulator above aspect ratio 10 or a
/// conductor etched down to an insulator (common practice, no source).
std::vector<std::string> charging_warnings(const Case&, const Expectation&);

} // namespace rille::engine
