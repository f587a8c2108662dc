// SPDX-License-Identifier: Apache-2.0
#include "engine/study/point_run.hpp"

#include "engine/case_file.hpp"
#include "engine/grid_search.hpp"
#include "engine/output_names.hpp"
#include "engine/run.hpp"
#include "engine/study/point_folder.hpp"
#include "engine/study/point_record.hpp"
#include "engine/study/study_folder.hpp"
#include "engine/study/study_names.hpp"
#include "geometry/check.hpp"

#include <algorithm>
#include <chrono>
#include <filesystem>
#include <new>
#include <optional>

namespace rille::engine {
namespace {

namespace fs = std::filesystem;
using Clock = std::chrono::steady_clock;

bool keeps(const std::vector<StudyKeep::Part>& parts, StudyKeep::Part part) {
    const auto has = [&](StudyKeep::Part p) {
        return std::find(parts.begin(), parts.end(), p) != parts.end();
    };
    return has(part) || has(StudyKeep::Part::everything);
}

/// Files that are needed on the way whatever the end.
RunParts parts_on_the_way(const StudyKeep& keep) {
    const RunParts each = run_parts(keep.each), failed = run_parts(keep.failed);
    RunParts parts = each;
    parts.frames = each.frames || failed.frames || each.pictures || failed.pictures;
    parts.resolved_case = false;
    return parts;
}

/// Follows one point: saves the state now and then, and sees openings close.
class PointWatcher : public RunObserver {
public:
    PointWatcher(const Case& the_case, RunOutput& output, const std::atomic<bool>& stop,
                 const std::function<void(double)>& progress)
        : spacing_(the_case.domain.spacing), output_(output), stop_(stop), progress_(progress) {}
    void progressed(const Simulation& simulation, const HistoryRow& row, double share) override {
        clogged_ = has_void(simulation) || has_filled_opening(row);
        if (progress_) progress_(share);
    }
    void framed(const SurfaceState& state) override { output_.add_frame(state); }
    void resumable(bool, const std::function<RunState()>& state) override {
        const auto now = Clock::now();
        if (!stop_ && now - saved_ < std::chrono::seconds(30)) return;
        output_.save(state());
        saved_ = now;
    }
    bool clogged() const { return clogged_; }

private:
    static bool has_void(const Simulation& simulation) {
        const auto& parts = simulation.isolated_parts();
        return std::any_of(parts.begin(), parts.end(), [](const IsolatedEvent& event) {
            return event.part.kind == geometry::IsolatedPart::Kind::closed_void;
        });
    }
    /// Filled to the top of its mask, within a cell.
    bool has_filled_opening(const HistoryRow& row) const {
        return std::any_of(row.features.begin(), row.features.end(), [&](const FeatureRow& f) {
            return f.mask_left && *f.mask_left > 0 && f.depth_centre &&
                   *f.mask_left + *f.depth_centre < spacing_;
        });
    }

    const double spacing_;
    RunOutput& output_;
    const std::atomic<bool>& stop_;
    const std::function<void(double)>& progress_;
    Clock::time_point saved_ = Clock::now();
    bool clogged_ = false;
};

/// What a stopped run has left, if it is whole and of this case.
std::optional<RunState> left_state(const Case& the_case, PointFolder& place) {
    if (!place.holds_state()) return std::nullopt;
    const std::string path = (fs::path(place.path()) / output_names::state).string();
    try {
        return read_state(the_case, read_file(path), path);
    } catch (const OutputError&) {
        place.empty();
        return std::nullopt;
    }
}

int exit_status_of(const std::exception_ptr& error) {
    try {
        std::rethrow_exception(error);
    } catch (const InputError&) {
        return 3;
    } catch (const NumericsError&) {
        return 4;
    } catch (const OutputError&) {
        return 5;
    } catch (...) {
        return 1;
    }
}

/// Errors that are not the point's own: the process is out of memory, or the folder not writable.
void rethrow_if_not_of_point(const std::exception_ptr& error) {
    try {
        if (error) std::rethrow_exception(error);
    } catch (const std::bad_alloc&) {
        throw;
    } catch (const OutputError&) {
        throw;
    } catch (...) {
    }
}

struct Attempt {
    const StudyAtWork& work;
    const StudyPoint point;
    const std::atomic<bool>& stop;
    const std::function<void(double)>& progress;
    PointFolder& place;
    PointRecord record;
};

/// The runs that were done on other grids before a point was stopped.
GridSearch left_grids(const Case& the_case, const Attempt& attempt) {
    const std::string path = (fs::path(attempt.place.path()) / output_names::grids).string();
    return GridSearch(the_case, fs::exists(path) ? read_file(path) : "", path);
}

/// One main run; false if it was told to stop.
bool run_main(Attempt& attempt, GridSearch& grids, const GridSearch::Next& next,
              OutputFolder& out) {
    const Case& the_case = next.the_case;
    const StudyKeep& keep = attempt.work.study.keep;
    const RunParts on_the_way = parts_on_the_way(keep);
    const std::optional<RunState> state = left_state(the_case, attempt.place);
    RunOutput output(out, the_case, state ? state->frames : std::vector<SeriesEntry>(), on_the_way);
    output.compare_with(grids);
    PointWatcher watcher(the_case, output, attempt.stop, attempt.progress);
    RunResult result = state ? resume_case(the_case, *state, watcher, attempt.stop)
                             : run_case(the_case, watcher, attempt.stop);
    rethrow_if_not_of_point(result.error);
    if (result.record.status == "interrupted") return false;
    grids.add(next, result.error ? Metrics() : measure(the_case, result.last),
              result.record.failure, result.record.wall_seconds);
    PointRecord& record = attempt.record;
    record.status =
        watcher.clogged() && !result.error ? study_names::clogged : result.record.status;
    record.failure = result.record.failure;
    record.seconds = result.record.wall_seconds;
    record.warnings.insert(record.warnings.end(), result.record.warnings.begin(),
                           result.record.warnings.end());
    if (result.error) record.exit_status = exit_status_of(result.error);
    output.finish(result, run_parts(result.error ? keep.failed : keep.each));
    out.remove(output_names::state);
    return true;
}

/// The point with its companions; false if it was told to stop.
bool follow(Attempt& attempt, const Case& the_case) {
    OutputFolder out(attempt.place.path(), OutputFolder::Existing::keep);
    GridSearch grids = left_grids(the_case, attempt);
    GridWatch watch;
    watch.save = [&](const std::string& text) { out.write(output_names::grids, text); };
    for (bool is_first = true;; is_first = false) {
        const auto next = run_companions(grids, watch, attempt.stop);
        if (!next) return false;
        if (next->kind == GridSearch::Next::Kind::end && !is_first) break;
        if (!run_main(attempt, grids, *next, out)) return false;
        if (grids.compares()) watch.save(grids.text());
    }
    attempt.record.seconds = grids.wall_seconds();
    if (!grids.is_met()) attempt.record.warnings.push_back(grids.summary());
    return true;
}

/// Loads and runs the case of a point; what is wrong with it becomes its record.
bool run_or_fail(Attempt& attempt) {
    try {
        const Case the_case =
            parse_case(attempt.work.base_text, study_names::base_case,
                       (fs::path(attempt.work.folder) / study_names::base).string(),
                       point_overrides(attempt.work.study, attempt.point));
        attempt.record.warnings = the_case.warnings;
        attempt.record.standing = the_case.standing;
        return follow(attempt, the_case);
    } catch (const std::bad_alloc&) {
        throw;
    } catch (const OutputError&) {
        throw;
    } catch (const std::exception& error) {
        attempt.record.status = study_names::failed;
        attempt.record.exit_status = exit_status_of(std::current_exception());
        attempt.record.failure = error.what();
    }
    return true;
}

/// Texts of a point must not tell in which folder it was made.
void make_relative(PointRecord& record, const std::string& temporary, const std::string& folder) {
    std::vector<std::string*> texts{&record.failure};
    for (std::string& warning : record.warnings)
        texts.push_back(&warning);
    for (std::string* text : texts)
        for (const std::string& prefix : {temporary + "/", folder + "/"})
            for (std::size_t at; (at = text->find(prefix)) != std::string::npos;)
                text->erase(at, prefix.size());
}

void write_record(const PointFolder& place, const PointRecord& record) {
    OutputFolder out(place.path(), OutputFolder::Existing::keep);
    out.write(study_names::point_record, point_record_text(record));
}

PointRecord new_record(const Study& study, const StudyPoint& point, int tries) {
    PointRecord record;
    record.point = point.index;
    record.name = point_name(study, point.index);
    for (const StudyValue& value : point.values)
        record.values.push_back(value.text);
    record.tries = tries;
    record.host = host_name();
    record.cpu_features_hash = cpu_features_hash();
    return record;
}

} // namespace

RunParts run_parts(const std::vector<StudyKeep::Part>& keep) {
    using Part = StudyKeep::Part;
    const bool all = keeps(keep, Part::everything);
    RunParts parts;
    parts.frames = keeps(keep, Part::frames);
    parts.resolved_case = parts.frames; // without which nothing can be measured again
    parts.history = keeps(keep, Part::history);
    parts.profile = keeps(keep, Part::last_profile);
    parts.pictures = keeps(keep, Part::picture);
    parts.level_set = parts.record = all;
    return parts;
}

StudyAtWork open_study(const std::string& folder) {
    const fs::path path = fs::absolute(folder);
    return {path.string(), reload_study((path / study_names::study).string()),
            read_file((path / study_names::base_case).string())};
}

PointOutcome run_point(const StudyAtWork& work, std::size_t index, int tries,
                       const std::atomic<bool>& stop, const std::function<void(double)>& progress) {
    const std::string name = point_name(work.study, index);
    if (PointFolder::is_finished(work.folder, name))
        return {PointOutcome::Kind::finished, study_names::done, 0};
    const auto started = Clock::now();
    PointFolder place(work.folder, name);
    const StudyPoint point = study_point(work.study, index);
    Attempt attempt{work, point, stop, progress, place, new_record(work.study, point, tries)};
    try {
        if (!run_or_fail(attempt)) {
            place.stop();
            return {PointOutcome::Kind::stopped, "", 0};
        }
        make_relative(attempt.record, place.path(), work.folder);
        if (attempt.record.seconds == 0)
            attempt.record.seconds = std::chrono::duration<double>(Clock::now() - started).count();
        write_record(place, attempt.record);
    } catch (const OutputError&) {
        if (place.is_there()) throw;
        return {PointOutcome::Kind::lost, "", 0};
    }
    place.finish();
    return {PointOutcome::Kind::finished, attempt.record.status, attempt.record.seconds};
}

void record_killed_point(const std::string& folder, const Study& study, std::size_t index,
                         int tries, const std::string& reason) {
    PointFolder place(folder, point_name(study, index));
    place.empty();
    PointRecord record = new_record(study, study_point(study, index), tries);
    record.status = study_names::killed;
    record.exit_status = 1;
    record.failure = reason;
    write_record(place, record);
    place.finish();
}

} // namespace rille::engine
