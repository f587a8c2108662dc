// SPDX-License-Identifier: Apache-2.0
#include "engine/study/point_folder.hpp"

#include "engine/output_folder.hpp"
#include "engine/output_names.hpp"
#include "engine/study/study_names.hpp"

#include <algorithm>
#include <cerrno>
#include <csignal>
#include <cstdlib>
#include <filesystem>
#include <fstream>
#include <iterator>
#include <unistd.h>
#include <vector>

namespace rille::engine {
namespace {

namespace fs = std::filesystem;

constexpr const char* stopped_mark = "stopped";

std::string points_folder(const std::string& study_folder) {
    return (fs::path(study_folder) / study_names::points).string();
}

bool is_number(const std::string& text) {
    return !text.empty() && text.find_first_not_of("0123456789") == std::string::npos;
}

/// Removes a folder so that it is never seen half removed under a name that means something.
void drop(const std::string& path) {
    std::error_code ignored; // what cannot be removed now is looked at by the next start
    fs::remove_all(path, ignored);
}

/// A process of this machine that may still be at work: not another one that has its number now,
/// nor one that has ended and that nobody has asked about (its command line is empty).
bool is_alive(long pid) {
    if (kill(static_cast<pid_t>(pid), 0) != 0 && errno != EPERM) return false;
    std::ifstream file("/proc/" + std::to_string(pid) + "/cmdline", std::ios::binary);
    const std::string command{std::istreambuf_iterator<char>(file), {}};
    return command.find("study") != std::string::npos;
}

bool holds_file(const std::string& folder, const char* name) {
    std::error_code ignored;
    return fs::exists(fs::path(folder) / name, ignored);
}

} // namespace

std::string host_name() {
    char name[256] = "localhost";
    gethostname(name, sizeof name - 1);
    return name;
}

PointEntry read_point_entry(const std::string& name) {
    PointEntry entry;
    if (is_number(name)) {
        entry.kind = PointEntry::Kind::finished;
        entry.point = name;
        return entry;
    }
    const std::size_t first = name.find('.', 1), last = name.rfind('.');
    if (name.empty() || name[0] != '.' || first == std::string::npos) return entry;
    entry.point = name.substr(1, first - 1);
    const std::string tail = name.substr(last + 1);
    if (!is_number(entry.point)) return entry;
    if (last == first && tail == stopped_mark) entry.kind = PointEntry::Kind::stopped;
    if (last == first || !is_number(tail)) return entry;
    entry.kind = PointEntry::Kind::running;
    entry.host = name.substr(first + 1, last - first - 1);
    entry.pid = std::strtol(tail.c_str(), nullptr, 10);
    return entry;
}

PointFolder::PointFolder(const std::string& study_folder, const std::string& point)
    : points_(points_folder(study_folder)), point_(point) {
    const fs::path mine =
        fs::path(points_) / ("." + point + "." + host_name() + "." + std::to_string(getpid()));
    path_ = mine.string();
    drop(path_); // of an earlier process of the same number
    std::error_code error;
    fs::rename(fs::path(points_) / ("." + point + "." + stopped_mark), mine, error);
    if (!error) return;
    fs::create_directory(mine, error);
    if (error) throw OutputError(path_, "cannot make the folder", error.message());
}

PointFolder::~PointFolder() {
    if (is_open_) drop(path_);
}

bool PointFolder::holds_state() const {
    return holds_file(path_, output_names::state);
}

bool PointFolder::is_there() const {
    std::error_code ignored;
    return fs::is_directory(path_, ignored);
}

void PointFolder::empty() {
    std::error_code error;
    for (const auto& entry : fs::directory_iterator(path_, error))
        drop(entry.path().string());
}

bool PointFolder::finish() {
    std::error_code error;
    fs::rename(path_, fs::path(points_) / point_, error);
    is_open_ = false;
    if (!error) return true;
    const bool other_was_first =
        error == std::errc::directory_not_empty || error == std::errc::file_exists;
    const std::string reason = error.message();
    const bool was_there = is_there();
    drop(path_);
    if (!other_was_first && was_there)
        throw OutputError((fs::path(points_) / point_).string(), "cannot put the point in place",
                          reason);
    return false;
}

void PointFolder::stop() {
    is_open_ = false;
    std::error_code error;
    if (holds_state())
        fs::rename(path_, fs::path(points_) / ("." + point_ + "." + stopped_mark), error);
    if (error || is_there()) drop(path_);
}

std::string PointFolder::final_path(const std::string& study_folder, const std::string& point) {
    return (fs::path(points_folder(study_folder)) / point).string();
}

bool PointFolder::is_finished(const std::string& study_folder, const std::string& point) {
    return holds_file(final_path(study_folder, point), study_names::point_record);
}

std::size_t clear_ended_points(const std::string& study_folder, bool all_ended) {
    const std::string points = points_folder(study_folder), here = host_name();
    std::vector<std::pair<PointEntry, std::string>> left; // as many as there were workers
    std::error_code error;
    for (const auto& found : fs::directory_iterator(points, error)) {
        const PointEntry entry = read_point_entry(found.path().filename().string());
        const bool is_here = entry.host == here;
        const bool has_result = (entry.kind == PointEntry::Kind::stopped ||
                                 (entry.kind == PointEntry::Kind::running && !is_here)) &&
                                PointFolder::is_finished(study_folder, entry.point);
        const bool ended = entry.kind == PointEntry::Kind::running &&
                           (all_ended || (is_here && !is_alive(entry.pid)));
        if (ended || has_result) left.emplace_back(entry, found.path().string());
    }
    std::size_t count = 0;
    for (const auto& [entry, path] : left) {
        const std::string stopped = points + "/." + entry.point + "." + stopped_mark;
        std::error_code taken;
        if (entry.kind == PointEntry::Kind::running) {
            ++count;
            if (holds_file(path, output_names::state) &&
                !PointFolder::is_finished(study_folder, entry.point))
                fs::rename(path, stopped, taken);
        }
        drop(path);
    }
    return count;
}

std::size_t count_finished_points(const std::string& study_folder) {
    std::error_code error;
    const fs::directory_iterator entries(points_folder(study_folder), error);
    return static_cast<std::size_t>(std::count_if(begin(entries), end(entries), [](const auto& e) {
        return read_point_entry(e.path().filename().string()).kind == PointEntry::Kind::finished;
    }));
}

} // namespace rille::engine
