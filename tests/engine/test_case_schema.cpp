// SPDX-License-Identifier: Apache-2.0
#include "engine/case_schema.hpp"

#include "engine/case_file.hpp"

#include <catch2/catch.hpp>
#include <nlohmann/json.hpp>

#include <algorithm>
#include <fstream>
#include <regex>
#include <sstream>

using namespace rille::engine;
using Json = nlohmann::json;

namespace {

/// A YAML value as an editor hands it to a JSON Schema checker.
Json value_of(const YamlNode& node) {
    if (node.is_map()) {
        Json object = Json::object();
        for (const auto& member : node.members)
            object[member.key] = value_of(member.value);
        return object;
    }
    if (node.is_list()) {
        Json array = Json::array();
        for (const YamlNode& item : node.items)
            array.push_back(value_of(item));
        return array;
    }
    if (node.is_empty()) return nullptr;
    if (!node.is_quoted && (node.text == "true" || node.text == "false"))
        return node.text == "true";
    if (!node.is_quoted && std::regex_match(node.text, std::regex("-?[0-9]+")))
        return std::stoll(node.text);
    if (!node.is_quoted && std::regex_match(node.text, std::regex("-?[0-9]+\\.[0-9]+")))
        return std::stod(node.text);
    return node.text;
}

bool has_type(const Json& value, const std::string& type) {
    return type == "object"    ? value.is_object()
           : type == "array"   ? value.is_array()
           : type == "string"  ? value.is_string()
           : type == "integer" ? value.is_number_integer()
           : type == "number"  ? value.is_number()
                               : value.is_boolean();
}

bool accepts(const Json& schema, const Json& value);

bool accepts_object(const Json& schema, const Json& value) {
    for (const Json& key : schema.value("required", Json::array()))
        if (!value.contains(key.get<std::string>())) return false;
    const Json known = schema.value("properties", Json::object());
    const Json others = schema.value("additionalProperties", Json(true));
    for (const auto& [key, member] : value.items()) {
        if (known.contains(key)   ? !accepts(known[key], member)
            : others.is_boolean() ? !others.get<bool>()
                                  : !accepts(others, member))
            return false;
    }
    return true;
}

bool accepts_number(const Json& schema, double value) {
    return value >= schema.value("minimum", -1e300) && value <= schema.value("maximum", 1e300) &&
           value > schema.value("exclusiveMinimum", -1e300) &&
           value < schema.value("exclusiveMaximum", 1e300);
}

/// The keywords that the schema uses, by the rules of draft 2020-12.
bool accepts(const Json& schema, const Json& value) {
    if (schema.contains("type") && !has_type(value, schema["type"])) return false;
    if (schema.contains("enum")) {
        const auto& words = schema["enum"];
        if (std::find(words.begin(), words.end(), value) == words.end()) return false;
    }
    if (schema.contains("anyOf")) {
        const auto& any = schema["anyOf"];
        if (std::none_of(any.begin(), any.end(), [&](const Json& s) { return accepts(s, value); }))
            return false;
    }
    if (schema.contains("pattern") && value.is_string() &&
        !std::regex_search(value.get<std::string>(),
                           std::regex(schema["pattern"].get<std::string>())))
        return false;
    if (value.is_number()) return accepts_number(schema, value.get<double>());
    if (value.is_object()) return accepts_object(schema, value);
    if (!value.is_array()) return true;
    const std::size_t most = schema.value("maxItems", std::size_t{1} << 30);
    if (value.size() < schema.value("minItems", std::size_t{0}) || value.size() > most)
        return false;
    return !schema.contains("items") ||
           std::all_of(value.begin(), value.end(),
                       [&](const Json& item) { return accepts(schema["items"], item); });
}

Json document(const std::string& path) {
    Problems problems;
    const YamlNode root = read_yaml_file(path, problems);
    REQUIRE(problems.empty());
    return value_of(root);
}

const std::string examples = std::string(RILLE_ROOT) + "/examples/";
const std::string malformed = std::string(RILLE_TESTS) + "/data/malformed/";

} // namespace

TEST_CASE("the schema accepts the examples and their resolved forms") {
    const Json schema = Json::parse(json_schema());
    CHECK(schema["$schema"] == "https://json-schema.org/draft/2020-12/schema");
    for (const char* name : {"poly-trench", "contact-via"}) {
        const std::string path = examples + name + "/case.yaml";
        CHECK(accepts(schema, document(path)));
        Problems problems;
        const YamlNode resolved =
            read_yaml_text(load_case(path).resolved_yaml, "resolved.yaml", problems);
        CHECK(accepts(schema, value_of(resolved)));
    }
}

TEST_CASE("the schema accepts groups of films and every shape of opening") {
    const Json schema = Json::parse(json_schema());
    Json c = document(examples + "contact-via/case.yaml");
    c["stack"].insert(c["stack"].begin(),
                      Json::parse(R"({"repeat": 64, "films": [{"name": "a", "material": "SiO2",
                                      "thickness": "20 nm"}]})"));
    c["mask"]["openings"] = Json::parse(R"([
        {"name": "a", "shape": "lines", "cd": "30 nm", "space": "30 nm", "count": 3},
        {"name": "b", "shape": "elliptic", "cd": ["30 nm", "40 nm"], "centre": ["1 nm", "-2 nm"]}])");
    CHECK(accepts(schema, c));
    c["mask"]["openings"][1]["cd"] = "30 nm";
    CHECK_FALSE(accepts(schema, c));
}

TEST_CASE("the schema rejects what can be seen without knowing the whole case") {
    const Json schema = Json::parse(json_schema());
    for (const char* name : {"01_no_unit", "02_unknown_key", "04_missing_keys", "05_empty_values",
                             "10_comment_without_space", "13_ambiguous_units",
                             "17_not_available_yet", "18_targets", "34_targets_after_a_step",
                             "21_wrong_shapes", "28_holes_in_extruded", "29_unknown_shape"}) {
        INFO(name);
        CHECK_FALSE(accepts(schema, document(malformed + name + ".yaml")));
    }
}

TEST_CASE("every key of the table has a meaning or a refusal, and its default is valid") {
    std::vector<const Rule*> open = {&case_rules()};
    int rules = 0;
    while (!open.empty()) {
        const Rule& rule = *open.back();
        open.pop_back();
        ++rules;
        INFO(rule.key);
        CHECK((!rule.meaning.empty() || !rule.refusal.empty()));
        if (rule.kind == Rule::Kind::sentence) {
            CHECK_FALSE(rule.form.empty());
        }
        for (const Rule& member : rule.members)
            open.push_back(&member);
    }
    CHECK(rules > 100);
}
