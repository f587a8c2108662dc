// SPDX-License-Identifier: Apache-2.0
#pragma once

#include <cstddef>
#include <optional>
#include <string>

namespace rille::engine {

/// The folder of a point while it is on its way: points/.NAME.HOST.PID, renamed to points/NAME at
/// its end, in one step. Several processes, on several machines, may work on the same point: each
/// has a folder of its own, and the first to end wins.
///
/// A point that was told to stop leaves points/.NAME.stopped, with the state from which any one
/// other process takes it up.
class PointFolder {
public:
    /// Makes the temporary folder, empty or as a stopped run has left it. Throws OutputError.
    PointFolder(const std::string& study_folder, const std::string& point);
    /// Removes the temporary folder unless it was put in place.
    ~PointFolder();
    PointFolder(const PointFolder&) = delete;
    PointFolder& operator=(const PointFolder&) = delete;

    const std::string& path() const { return path_; } ///< of the temporary folder
    bool holds_state() const;                         ///< a run can be taken up
    bool is_there() const;                            ///< nobody has taken the folder away
    void empty();                                     ///< removes what is in it
    /// Puts it in place. False if another process was first; then this one is dropped.
    bool finish();
    /// Leaves it to be taken up, if there is a state in it.
    void stop();

    static std::string final_path(const std::string& study_folder, const std::string& point);
    static bool is_finished(const std::string& study_folder, const std::string& point);

private:
    std::string points_, point_, path_;
    bool is_open_ = true;
};

/// What a name in points/ stands for.
struct PointEntry {
    enum class Kind { finished, stopped, running, other };
    Kind kind = Kind::other;
    std::string point; ///< "0001"
    std::string host;
    long pid = 0;
};
PointEntry read_point_entry(const std::string& name);

/// Looks after what ended processes have left in points/: a folder with a state is left to be taken
/// up, others are removed. Of processes on other machines nothing is known, so what they have of
/// points without result stays; `all_ended` says that they have ended too. Returns how many there
/// were.
std::size_t clear_ended_points(const std::string& study_folder, bool all_ended = false);

/// Number of finished points.
std::size_t count_finished_points(const std::string& study_folder);

std::string host_name();

} // namespace rille::engine
