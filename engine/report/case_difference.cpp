// SPDX-License-Identifier: Apache-2.0
#include "engine/report/case_difference.hpp"

#include <set>
#include <yaml-cpp/yaml.h>

namespace rille::engine {
namespace {

void collect(const YAML::Node& node, const std::string& path,
             std::map<std::string, std::string>& values) {
    const auto below = [&](const std::string& key) {
        return path.empty() ? key : path + "." + key;
    };
    if (node.IsMap()) {
        for (const auto& item : node)
            collect(item.second, below(item.first.Scalar()), values);
        return;
    }
    if (!node.IsSequence()) {
        values[path] = node.IsScalar() ? node.Scalar() : "";
        return;
    }
    bool plain = true; // a list of numbers or words reads as one value
    std::string joined;
    for (const YAML::Node& item : node) {
        plain = plain && item.IsScalar();
        joined += (joined.empty() ? "" : ", ") + (item.IsScalar() ? item.Scalar() : "");
    }
    if (plain) {
        values[path] = "[" + joined + "]";
        return;
    }
    std::size_t index = 0;
    for (const YAML::Node& item : node) {
        ++index;
        const YAML::Node name = item.IsMap() ? item["name"] : YAML::Node();
        collect(item,
                below(name.IsDefined() && name.IsScalar() ? name.Scalar() : std::to_string(index)),
                values);
    }
}

} // namespace

std::map<std::string, std::string> case_values(const std::string& yaml) {
    std::map<std::string, std::string> values;
    try {
        const YAML::Node root = YAML::Load(yaml);
        if (root.IsMap()) collect(root, "", values);
    } catch (const YAML::Exception&) {
        return {};
    }
    return values;
}

std::vector<CaseDifference>
case_differences(const std::vector<std::map<std::string, std::string>>& cases) {
    std::set<std::string> paths;
    for (const auto& values : cases)
        for (const auto& [path, value] : values)
            paths.insert(path);
    std::vector<CaseDifference> differences;
    for (const std::string& path : paths) {
        CaseDifference difference{path, {}};
        bool differs = false;
        for (const auto& values : cases) {
            const auto found = values.find(path);
            difference.values.push_back(found == values.end() ? "" : found->second);
            differs = differs || difference.values.back() != difference.values.front();
        }
        if (differs) differences.push_back(std::move(difference));
    }
    return differences;
}

} // namespace rille::engine
