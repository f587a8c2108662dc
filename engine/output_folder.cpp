// SPDX-License-Identifier: Apache-2.0
#include "engine/output_folder.hpp"

#include "engine/output_names.hpp"

#include <algorithm>
#include <cerrno>
#include <cstdio>
#include <cstring>
#include <filesystem>
#include <memory>

namespace rille::engine {
namespace {

namespace fs = std::filesystem;

using File = std::unique_ptr<std::FILE, int (*)(std::FILE*)>;

std::string reason() {
    return std::strerror(errno);
}

void write_plain(const std::string& path, std::string_view content) {
    File file(std::fopen(path.c_str(), "wb"), &std::fclose);
    if (!file) throw OutputError(path, "cannot create the file", reason());
    if (std::fwrite(content.data(), 1, content.size(), file.get()) != content.size() ||
        std::fflush(file.get()) != 0)
        throw OutputError(path, "cannot write the file", reason());
    if (std::fclose(file.release()) != 0)
        throw OutputError(path, "cannot finish the file", reason());
}

void remove_quietly(const std::string& path) {
    std::error_code ignored; // the error that led here is the one to report
    fs::remove(path, ignored);
}

/// The temporary name: hidden and in the same folder, so that renaming never crosses a file system.
std::string temporary(const fs::path& place) {
    return (place.parent_path() / ("." + place.filename().string() + ".part")).string();
}

void make_folder(const std::string& path) {
    std::error_code error;
    fs::create_directories(path, error);
    if (error) throw OutputError(path, "cannot make the folder", error.message());
    if (!fs::is_directory(path, error))
        throw OutputError(path, "cannot make the folder", "something else has this name");
}

/// A frame, or what a run that was killed has left of one.
bool is_frame(const fs::path& path) {
    const fs::path name = path.extension() == ".part" ? path.stem() : path.filename();
    return name.extension() == ".vtp";
}

/// A drawing that a report has left as a file.
bool is_figure(const fs::path& path) {
    return path.extension() == ".svg" || path.extension() == ".png";
}

void remove_earlier_run(const std::string& path) {
    std::error_code error;
    for (const char* name : output_names::all) {
        fs::remove(fs::path(path) / name, error);
        if (error) throw OutputError(path + "/" + name, "cannot remove the file", error.message());
        remove_quietly(temporary(fs::path(path) / name)); // of a run that was killed
    }
    for (const char* name : {output_names::state, output_names::comparison, output_names::report,
                             output_names::grids, output_names::flux_csv, output_names::flux_json,
                             output_names::flux_svg, output_names::flux_png})
        remove_quietly((fs::path(path) / name).string());
    const fs::path arc_data = fs::path(path) / output_names::arc_data;
    if (fs::is_directory(arc_data, error))
        for (const auto& entry : fs::directory_iterator(arc_data, error))
            if (entry.path().extension() == ".csv") remove_quietly(entry.path().string());
    const fs::path figures = fs::path(path) / output_names::figures;
    if (fs::is_directory(figures, error))
        for (const auto& entry : fs::directory_iterator(figures, error))
            if (is_figure(entry.path())) remove_quietly(entry.path().string());
    const fs::path frames = fs::path(path) / output_names::frames;
    if (!fs::is_directory(frames, error)) return;
    for (const auto& entry : fs::directory_iterator(frames, error))
        if (is_frame(entry.path())) fs::remove(entry.path(), error);
    if (error) throw OutputError(frames.string(), "cannot empty the folder", error.message());
}

} // namespace

OutputFolder::OutputFolder(std::string path, Existing existing) : path_(std::move(path)) {
    if (path_.empty()) throw OutputError("(empty)", "cannot make the folder", "no name given");
    std::error_code error;
    if (existing == Existing::keep && !fs::is_directory(path_, error))
        throw OutputError(path_, "cannot look into the folder", "there is none of this name");
    make_folder(path_);
    const bool empty = fs::is_empty(path_, error);
    if (error) throw OutputError(path_, "cannot look into the folder", error.message());
    if (!empty && existing == Existing::refuse)
        throw OutputError(path_, "will not write here",
                          "the folder holds files; name another one, or use --force");
    const std::string probe = temporary(fs::path(path_) / "write-test");
    try {
        write_plain(probe, std::string(4096, '\n'));
    } catch (const OutputError&) {
        remove_quietly(probe);
        throw;
    }
    remove_quietly(probe);
    if (!empty && existing == Existing::force) remove_earlier_run(path_);
}

void OutputFolder::write(const std::string& name, std::string_view content) {
    write_with(name, [&](const std::string& path) { write_plain(path, content); });
}

void OutputFolder::write_with(const std::string& name,
                              const std::function<void(const std::string&)>& writer) {
    const fs::path place = fs::path(path_) / name;
    if (place.parent_path() != fs::path(path_)) make_folder(place.parent_path().string());
    const std::string part = temporary(place);
    try {
        writer(part);
    } catch (const OutputError&) {
        remove_quietly(part);
        throw;
    } catch (const std::exception& error) {
        remove_quietly(part);
        throw OutputError(place.string(), "cannot write the file", error.what());
    }
    std::error_code error;
    fs::rename(part, place, error);
    if (error) {
        remove_quietly(part);
        throw OutputError(place.string(), "cannot put the file in place", error.message());
    }
    note(name);
}

void OutputFolder::note(const std::string& name) {
    const auto at = std::lower_bound(written_.begin(), written_.end(), name);
    if (at == written_.end() || *at != name) written_.insert(at, name);
}

void OutputFolder::remove(const std::string& name) {
    remove_quietly((fs::path(path_) / name).string());
    written_.erase(std::remove(written_.begin(), written_.end(), name), written_.end());
}

std::vector<std::string> OutputFolder::written() const {
    return written_;
}

std::string read_file(const std::string& path) {
    File file(std::fopen(path.c_str(), "rb"), &std::fclose);
    if (!file) throw OutputError(path, "cannot open the file", reason());
    std::string content;
    char buffer[65536];
    while (const std::size_t got = std::fread(buffer, 1, sizeof buffer, file.get()))
        content.append(buffer, got);
    if (std::ferror(file.get())) throw OutputError(path, "cannot read the file", reason());
    return content;
}

} // namespace rille::engine
