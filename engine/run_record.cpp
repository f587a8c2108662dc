// SPDX-License-Identifier: Apache-2.0
#include "engine/run_record.hpp"

#include "engine/case.hpp"
#include "engine/caution.hpp"
#include "engine/version.hpp"

#include <fmt/format.h>
#include <glib.h>
#include <memory>
#include <nlohmann/json.hpp>
#include <sys/resource.h>

namespace rille::engine {
namespace {

using nlohmann::json;

int count(const Case& c, fluxes::Standing standing) {
    const auto found = c.standing.find(standing);
    return found == c.standing.end() ? 0 : found->second;
}

json standing_json(const Case& c) {
    return {{"measured", count(c, fluxes::Standing::measured)},
            {"published", count(c, fluxes::Standing::published)},
            {"from_memory", count(c, fluxes::Standing::from_memory)},
            {"illustrative", count(c, fluxes::Standing::illustrative)}};
}

json steps_json(const std::vector<StepOutcome>& steps) {
    json list = json::array();
    for (const StepOutcome& step : steps)
        list.push_back({{"name", step.name},
                        {"start_s", step.start_s},
                        {"end_s", step.end_s},
                        {"duration_s", step.end_s - step.start_s},
                        {"ended_by", step.reason}});
    return list;
}

json unused_json(const Case& c) {
    json unused = json::object();
    for (const auto& [name, plasma] : c.plasmas)
        if (!plasma.unused.empty()) unused[name] = plasma.unused;
    return unused;
}

json inputs_json(const Case& c) {
    json list = json::array();
    for (const InputFile& file : c.inputs)
        list.push_back({{"file", file.name},
                        {"read_from", file.path},
                        {"sha256", content_hash(file.content)}});
    return list;
}

json machine_json(const RunRecord& record) {
    return {{"threads", record.threads},
            {"cpu_features", cpu_features()},
            {"wall_seconds", record.wall_seconds},
            {"peak_memory_bytes", record.peak_memory_bytes}};
}

} // namespace

bool is_at_its_end(const std::string& status) {
    return status == "done" || status == "not cleared";
}

json record_json(const Case& c, const RunRecord& record, const std::vector<std::string>& files) {
    json timings = json::object();
    for (const PhaseTime& phase : record.timings)
        timings[phase.name + "_s"] = phase.seconds;
    std::vector<std::string> films;
    for (const geometry::Film& film : c.films)
        films.push_back(film.name);
    std::vector<std::string> warnings = c.warnings;
    warnings.insert(warnings.end(), record.warnings.begin(), record.warnings.end());
    const double lost =
        record.rays ? static_cast<double>(record.lost_rays) / static_cast<double>(record.rays) : 0;
    return {{"format", 1},
            {"title", c.title},
            {"status", record.status},
            {"failure", record.failure},
            {"program",
             {{"name", "rille"},
              {"version", version()},
              {"revision", revision()},
              {"build", build_info()}}},
            {"command", record.command},
            {"case_file", c.file},
            {"case_sha256", content_hash(c.resolved_yaml)},
            {"inputs", inputs_json(c)},
            {"chemistry", c.chemistry},
            {"started", record.started},
            {"resumed", record.resumed},
            {"seed", c.seed},
            {"machine", machine_json(record)},
            {"timings", timings},
            {"simulated_s", record.simulated_s},
            {"steps", steps_json(record.steps)},
            {"warnings", warnings},
            {"materials", c.materials},
            {"films", films},
            {"parameter_standing", standing_json(c)},
            {"not_used", {{"plasmas", unused_json(c)}, {"tool_log", c.tool_log}}},
            {"numerics",
             {{"spacing_nm", c.domain.spacing},
              {"spacing_asked_nm", c.spacing_asked},
              {"rays_per_element", c.rays_per_element},
              {"ions_per_species", c.ions_per_species},
              {"computed", record.computed},
              {"surface_elements", record.elements},
              {"voxels", record.voxels},
              {"refreshes", record.refreshes},
              {"rays", record.rays},
              {"lost_rays", record.lost_rays},
              {"lost_share", lost},
              {"redistance_shift_cells", record.redistance_shift}}},
            {"accuracy", record.accuracy},
            {"files", files},
            {"caution", caution}};
}

std::vector<std::string> cpu_features() {
    std::vector<std::string> found;
#if defined(__x86_64__)
    __builtin_cpu_init();
    if (__builtin_cpu_supports("sse4.2")) found.emplace_back("sse4.2");
    if (__builtin_cpu_supports("avx")) found.emplace_back("avx");
    if (__builtin_cpu_supports("fma")) found.emplace_back("fma");
    if (__builtin_cpu_supports("fma4")) found.emplace_back("fma4");
    if (__builtin_cpu_supports("avx2")) found.emplace_back("avx2");
    if (__builtin_cpu_supports("avx512f")) found.emplace_back("avx512f");
#endif
    return found;
}

std::string content_hash(const std::string& text) {
    const std::unique_ptr<char, void (*)(void*)> digest(
        g_compute_checksum_for_data(G_CHECKSUM_SHA256, reinterpret_cast<const guchar*>(text.data()),
                                    text.size()),
        &g_free);
    return digest.get();
}

std::uint64_t peak_memory_bytes() {
    rusage usage{};
    if (getrusage(RUSAGE_SELF, &usage) != 0) return 0;
    return static_cast<std::uint64_t>(usage.ru_maxrss) * 1024; // Linux counts in KiB
}

std::string standing_line(const Case& c) {
    return fmt::format("parameters: {} measured, {} published, {} from memory, {} illustrative",
                       count(c, fluxes::Standing::measured), count(c, fluxes::Standing::published),
                       count(c, fluxes::Standing::from_memory),
                       count(c, fluxes::Standing::illustrative));
}

} // namespace rille::engine
