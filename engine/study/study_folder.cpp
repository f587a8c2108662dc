// SPDX-License-Identifier: Apache-2.0
#include "engine/study/study_folder.hpp"

#include "engine/output_folder.hpp"
#include "engine/run_record.hpp"
#include "engine/study/study_names.hpp"
#include "engine/version.hpp"

#include <algorithm>
#include <filesystem>
#include <nlohmann/json.hpp>

namespace rille::engine {
namespace {

namespace fs = std::filesystem;
using nlohmann::json;

json columns_json(const Study& study) {
    json list = json::array();
    for (const StudyColumn& column : study.columns)
        list.push_back({{"path", column.path},
                        {"label", column.label},
                        {"unit", column.unit},
                        {"is_linked", column.is_linked},
                        {"is_logarithmic", column.is_logarithmic}});
    return list;
}

json answer_json(const Study& study) {
    if (study.answer.y.empty()) return nullptr;
    json answer = {{"y", study.answer.y},
                   {"feature", study.answer.feature},
                   {"x", study.answer.x},
                   {"line_per", nullptr}};
    if (study.answer.line_per) answer["line_per"] = *study.answer.line_per;
    return answer;
}

json comparison_json(const Study& study) {
    if (!study.comparison) return nullptr;
    const StudyComparison& c = *study.comparison;
    std::string file = c.file;
    for (const InputFile& copy : study.inputs)
        if (copy.path == c.file) file = copy.name;
    return {{"file", file},     {"join", c.join},   {"value", c.value},
            {"sigma", c.sigma}, {"sites", c.sites}, {"tolerance", c.tolerance}};
}

/// Files that a kill has left under the name that they have while they are written.
bool is_leftover(const fs::path& path) {
    return path.extension() == ".part";
}

bool holds_nothing(const std::string& folder) {
    std::error_code error;
    if (!fs::exists(folder, error)) return true;
    if (!fs::is_directory(folder, error))
        throw OutputError(folder, "cannot write a study here", "this is no folder");
    const fs::directory_iterator entries(folder, error);
    if (error) throw OutputError(folder, "cannot look into the folder", error.message());
    return std::all_of(begin(entries), end(entries),
                       [](const fs::directory_entry& entry) { return is_leftover(entry.path()); });
}

std::string text_of(const json& object, const char* key) {
    const auto found = object.find(key);
    return found != object.end() && found->is_string() ? found->get<std::string>() : "";
}

void check_manifest(const std::string& folder, const json& manifest, const StudySources& sources) {
    constexpr const char* tried = "cannot go on with the study in this folder";
    constexpr const char* advice = "; name another folder, or use --force to begin anew";
    if (!manifest.is_object() || manifest.value("format", json()) != 1)
        throw OutputError(folder, tried,
                          std::string("its ") + study_names::manifest +
                              " is not one that this version writes" + advice);
    const std::string made_by = text_of(manifest, "rille") + " " + text_of(manifest, "revision");
    const std::string program = version() + " " + revision();
    if (made_by != program)
        throw OutputError(folder, tried,
                          "it was begun by rille " + made_by + " and this is rille " + program +
                              ", whose results need not agree" + advice);
    if (text_of(manifest, "hash") != sources.hash)
        throw OutputError(folder, tried,
                          "it holds another study, \"" + text_of(manifest, "title") +
                              "\", or the base case, a table or the plan was changed since" +
                              advice);
}

void remove_earlier_study(const std::string& folder) {
    std::error_code error;
    // The manifest stays until it is replaced: a kill here leaves the folder of a study.
    for (const char* name : study_names::all_folders) {
        fs::remove_all(fs::path(folder) / name, error);
        if (error) throw OutputError(folder + "/" + name, "cannot be removed", error.message());
    }
    for (const char* name : study_names::all_files) {
        if (name == study_names::manifest) continue;
        fs::remove(fs::path(folder) / name, error);
        if (error) throw OutputError(folder + "/" + name, "cannot be removed", error.message());
    }
}

/// Leaves a file that holds this text already alone: others may be reading it.
void write_if_new(OutputFolder& out, const std::string& name, const std::string& content) {
    const fs::path path = fs::path(out.path()) / name;
    std::error_code ignored;
    if (fs::exists(path, ignored) && read_file(path.string()) == content) return;
    out.write(name, content);
}

} // namespace

std::string cpu_features_hash() {
    std::string all;
    for (const std::string& feature : cpu_features())
        all += feature + " ";
    return content_hash(all).substr(0, 16);
}

json study_manifest(const Study& study, const StudySources& sources) {
    return {{"format", 1},
            {"rille", version()},
            {"revision", revision()},
            {"hash", sources.hash},
            {"cpu_features", cpu_features()},
            {"title", study.title},
            {"plan", study.plan},
            {"points", study.points},
            {"columns", columns_json(study)},
            {"answer", answer_json(study)},
            {"comparison", comparison_json(study)},
            {"constants", study.constants},
            {"warnings", study.warnings}};
}

StudyPlace look_at_study_folder(const std::string& folder, const StudySources& sources) {
    if (holds_nothing(folder)) return StudyPlace::fresh;
    const fs::path path = fs::path(folder) / study_names::manifest;
    std::error_code ignored;
    if (!fs::exists(path, ignored))
        throw OutputError(folder, "will not write here",
                          "the folder holds files and is not that of a study; name another one");
    const json manifest = json::parse(read_file(path.string()), nullptr, false);
    check_manifest(folder, manifest, sources);
    return StudyPlace::known;
}

void prepare_study_folder(const std::string& folder, const Study& study,
                          const StudySources& sources, bool replace) {
    std::error_code ignored;
    const bool is_study = fs::exists(fs::path(folder) / study_names::manifest, ignored);
    StudyPlace place = StudyPlace::fresh;
    if (replace && is_study)
        remove_earlier_study(folder);
    else
        place = look_at_study_folder(folder, sources);
    std::error_code error;
    fs::create_directories(folder, error);
    if (error) throw OutputError(folder, "cannot make the folder", error.message());
    OutputFolder out(folder, OutputFolder::Existing::keep);
    // The manifest comes first, so that a study cut off here is known as such.
    json manifest = study_manifest(study, sources);
    if (place == StudyPlace::known)
        manifest["cpu_features"] =
            json::parse(read_file((fs::path(folder) / study_names::manifest).string()), nullptr,
                        false)
                .value("cpu_features", manifest["cpu_features"]);
    write_if_new(out, study_names::manifest, manifest.dump(2) + "\n");
    for (const InputFile& file : sources.base_inputs)
        write_if_new(out, std::string(study_names::base) + "/" + file.name, file.content);
    write_if_new(out, study_names::base_case, sources.base_yaml);
    for (const InputFile& file : sources.inputs)
        write_if_new(out, file.name, file.content);
    write_if_new(out, study_names::study, sources.study_yaml);
    fs::create_directories(fs::path(folder) / study_names::points, error);
    if (error)
        throw OutputError(folder + "/" + study_names::points, "cannot make the folder",
                          error.message());
}

} // namespace rille::engine
