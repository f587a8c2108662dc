// SPDX-License-Identifier: Apache-2.0
#include "engine/case_file.hpp"

#include "engine/case_build.hpp"
#include "engine/case_schema.hpp"
#include "engine/state_table.hpp"
#include "engine/words.hpp"
#include "fluxes/exchange.hpp"

#include <fmt/format.h>

#include <filesystem>

namespace rille::engine {

namespace {

/// Rays and ions come in eight equal batches, from which the sampling error is taken.
int batched(const Entry& entry, Problems& problems) {
    const auto count = static_cast<int>(entry.number);
    if (entry.is_good && count % fluxes::batches != 0)
        problems.add(
            entry.at, entry.path,
            fmt::format("{} is not a multiple of {}", quoted(entry.text), fluxes::batches));
    return count;
}

void build_sampling(const Entry& root, Case& result, Problems& problems) {
    const Entry& sampling = root["sampling"];
    result.rays_per_element = batched(sampling["rays_per_point"], problems);
    result.ions_per_species = batched(sampling["ions_per_species"], problems);
    result.seed = static_cast<std::uint64_t>(sampling["seed"].number);
    // A floor that goes down round about an axis may leave cells behind it at once: what arrives
    // changes with the depth in radii.
    const Entry& renewed = sampling["renew_after"];
    result.refresh_move = renewed.is_good ? renewed.number : result.domain.revolved() ? 2.0 : 0.5;
}

Case build(YamlNode node, const std::string& name, const std::string& folder,
           const std::vector<std::string>& overrides, Problems& problems) {
    if (!node.is_map()) problems.throw_if_any(); // a syntax error: there is nothing to check
    apply_overrides(node, overrides, problems);
    Case result = build_case(std::move(node), name, folder, true, problems).result;
    problems.throw_if_any();
    return result;
}

} // namespace

BuiltCase build_case(YamlNode node, const std::string& name, const std::string& folder,
                     bool with_arrivals, Problems& problems) {
    copy_plasmas(node, problems);
    absolute_files(node, folder);
    apply_state_tables(node, problems);
    if (node.at.file.empty()) node.at.file = name;
    BuiltCase built{{}, check(node, case_rules(), problems)};
    Entry& root = built.root;
    Case& result = built.result;
    result.file = name;
    if (!root.is_good) return built;
    build_domain(root, result, problems);
    build_stack(root, result, problems);
    build_mask(root, result, problems);
    build_start(root, result, problems);
    build_plasmas(root, result, problems);
    build_recipe(root, result, problems);
    build_measure(root, result, problems);
    build_measured(root, result, problems);
    build_targets(root, result, problems);
    build_sampling(root, result, problems);
    build_chemistry(root, folder, result, problems);
    if (with_arrivals) build_arrivals(root, result, problems);
    if (!problems.empty()) return built;
    result.shown_yaml = to_yaml(root);
    Entry kept = root;
    keep_inputs(kept, result);
    result.resolved_yaml = to_yaml(kept);
    return built;
}

Case parse_case(const std::string& text, const std::string& name, const std::string& folder,
                const std::vector<std::string>& overrides) {
    Problems problems;
    YamlNode node = read_yaml_text(text, name, problems);
    return build(std::move(node), name, folder, overrides, problems);
}

Case load_case(const std::string& path, const std::vector<std::string>& overrides) {
    Problems problems;
    YamlNode node = read_yaml_file(path, problems);
    const std::string folder = std::filesystem::path(path).parent_path().string();
    return build(std::move(node), path, folder.empty() ? "." : folder, overrides, problems);
}

} // namespace rille::engine
