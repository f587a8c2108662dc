// SPDX-License-Identifier: Apache-2.0
#include "engine/study/point_record.hpp"

#include "engine/output_folder.hpp"
#include "engine/study/point_folder.hpp"
#include "engine/study/study_names.hpp"

#include <filesystem>
#include <nlohmann/json.hpp>

namespace rille::engine {
namespace {

using nlohmann::json;

constexpr std::pair<fluxes::Standing, const char*> standings[] = {
    {fluxes::Standing::measured, "measured"},
    {fluxes::Standing::published, "published"},
    {fluxes::Standing::from_memory, "from_memory"},
    {fluxes::Standing::illustrative, "illustrative"}};

} // namespace

std::string point_record_text(const PointRecord& record) {
    json standing = json::object();
    for (const auto& [key, name] : standings) {
        const auto found = record.standing.find(key);
        if (!record.standing.empty())
            standing[name] = found == record.standing.end() ? 0 : found->second;
    }
    const json out = {{"format", 1},
                      {"point", record.point},
                      {"name", record.name},
                      {"status", record.status},
                      {"exit_status", record.exit_status},
                      {"failure", record.failure},
                      {"values", record.values},
                      {"seconds", record.seconds},
                      {"tries", record.tries},
                      {"warnings", record.warnings},
                      {"standing", standing},
                      {"host", record.host},
                      {"cpu_features_hash", record.cpu_features_hash}};
    return out.dump(2, ' ', false, json::error_handler_t::replace) + "\n";
}

PointRecord read_point_record(const std::string& text, const std::string& path) {
    try {
        const json in = json::parse(text);
        PointRecord record;
        in.at("point").get_to(record.point);
        in.at("name").get_to(record.name);
        in.at("status").get_to(record.status);
        in.at("exit_status").get_to(record.exit_status);
        in.at("failure").get_to(record.failure);
        in.at("values").get_to(record.values);
        in.at("seconds").get_to(record.seconds);
        in.at("tries").get_to(record.tries);
        in.at("warnings").get_to(record.warnings);
        for (const auto& [key, name] : standings)
            if (in.at("standing").contains(name)) record.standing[key] = in["standing"][name];
        in.at("host").get_to(record.host);
        in.at("cpu_features_hash").get_to(record.cpu_features_hash);
        return record;
    } catch (const json::exception& error) {
        throw OutputError(path, "cannot read the record of a point", error.what());
    }
}

std::string point_status(const std::string& study_folder, const std::string& point) {
    const std::string path = (std::filesystem::path(PointFolder::final_path(study_folder, point)) /
                              study_names::point_record)
                                 .string();
    return read_point_record(read_file(path), path).status;
}

} // namespace rille::engine
