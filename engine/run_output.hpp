// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/grid_search.hpp"
#include "engine/metrics.hpp"
#include "engine/output_folder.hpp"
#include "engine/picture.hpp"
#include "engine/run_result.hpp"
#include "engine/run_state.hpp"
#include "engine/surface_flux.hpp"
#include "engine/vtk_files.hpp"

#include <vector>

namespace rille::engine {

/// What of a run is written; metrics always are.
struct RunParts {
    bool resolved_case = true; ///< with copies of the files that it names
    bool frames = true;
    bool history = true;
    bool profile = true; ///< with what a measured contour differs by
    bool level_set = true;
    /// With the table of what made the shape; the profile's needs frames where a run may be taken
    /// up.
    bool pictures = true;
    bool record = true;
};

/// Writes a run into its folder: frames as they come, everything else at the end. After every call
/// the folder is valid as it stands, so an interrupted run leaves what it had.
class RunOutput {
public:
    /// Writes the resolved case at once. Folder and case must outlive this object.
    RunOutput(OutputFolder&, const Case&, const RunParts& = {});
    /// Takes up an earlier part of the run: its frames are read back. Throws OutputError.
    RunOutput(OutputFolder&, const Case&, const std::vector<SeriesEntry>& frames,
              const RunParts& = {});

    /// Grid errors of the metrics come from this search, which must outlive this object.
    void compare_with(const GridSearch& grids) { grids_ = &grids; }
    /// Writes the state from which the run can be taken up, with the frames so far.
    void save(RunState);
    /// Writes one frame and renews the series file. Times must not fall; the first is the start. A
    /// frame at the time of the one before replaces it.
    void add_frame(const SurfaceState&);
    /// Writes arrivals and causes along the surface at one time into the folder arc_data.
    void add_arc_data(const SurfaceFlux&);
    /// Writes history, profile, causes, metrics, level set, picture and record; adds `result.last`
    /// as a frame if it is later than the last one. Returns the metrics. May be called again. A run
    /// that came to its end leaves no state to be taken up.
    Metrics finish(const RunResult& result) { return finish(result, parts_); }
    /// The same with a choice of its own: a run that failed may leave more than others, and one
    /// that did not loses the frames that it wrote on its way.
    Metrics finish(const RunResult& result, const RunParts&);

private:
    void write_case();
    void write_pictures(const RunResult&, const Metrics&);
    void remove_frames();
    void write_record(const RunResult&);

    OutputFolder& folder_;
    const Case& case_;
    RunParts parts_;
    const GridSearch* grids_ = nullptr;
    std::vector<SeriesEntry> series_;
    std::vector<PictureFront> fronts_;
};

} // namespace rille::engine
