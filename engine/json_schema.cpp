// SPDX-License-Identifier: Apache-2.0
#include "engine/case_schema.hpp"

#include <fmt/format.h>
#include <nlohmann/json.hpp>

#include <cmath>

namespace rille::engine {

namespace {

using Json = nlohmann::ordered_json;
using Kind = Rule::Kind;

std::string escaped(const std::string& unit) {
    std::string result;
    for (const char c : unit) {
        if (std::string("/().^+$*?[]{}|\\").find(c) != std::string::npos) result += '\\';
        result += c;
    }
    return result;
}

std::string quantity_pattern(Dimension dimension) {
    std::string units;
    for (const UnitDefinition& unit : units_of(dimension))
        units += (units.empty() ? "" : "|") + escaped(unit.text);
    return "^[+-]?([0-9]+\\.?[0-9]*|\\.[0-9]+)([eE][+-]?[0-9]+)? *(" + units + ")$";
}

std::string description(const Rule& rule) {
    std::string text = rule.meaning;
    const bool measured = rule.kind == Kind::quantity || rule.kind == Kind::quantities;
    if (measured) {
        text += fmt::format(" [{}", unit_list(rule.dimension));
        const std::string range = range_text(rule.range, rule.dimension);
        text += range.empty() ? "]" : "; " + range + "]";
    }
    if (!rule.form.empty()) text += " [" + rule.form + "]";
    if (!rule.default_text.empty() && rule.default_text != "{}")
        text += " (default " + rule.default_text + ")";
    return text;
}

Json schema_of(const Rule& rule);

Json map_schema(const Rule& rule) {
    Json schema = {{"type", "object"}, {"additionalProperties", false}};
    Json properties = Json::object();
    Json required = Json::array();
    for (const Rule& member : rule.members) {
        if (!member.refusal.empty()) continue;
        properties[member.key] = schema_of(member);
        if (member.is_required) required.push_back(member.key);
    }
    schema["properties"] = properties;
    if (!required.empty()) schema["required"] = required;
    return schema;
}

Json bounded(const Rule& rule, const char* type) {
    Json schema = {{"type", type}};
    if (std::isfinite(rule.range.low))
        schema[rule.range.low_open ? "exclusiveMinimum" : "minimum"] = rule.range.low;
    if (std::isfinite(rule.range.high))
        schema[rule.range.high_open ? "exclusiveMaximum" : "maximum"] = rule.range.high;
    return schema;
}

Json quantities_schema(const Rule& rule) {
    const Json one = {{"type", "string"}, {"pattern", quantity_pattern(rule.dimension)}};
    const Json list = {{"type", "array"},
                       {"items", one},
                       {"minItems", rule.least_items},
                       {"maxItems", rule.most_items}};
    if (rule.least_items > 1) return list;
    return {{"anyOf", Json::array({one, list})}};
}

Json form_of(const Rule& rule) {
    switch (rule.kind) {
    case Kind::text:
        return {{"type", "string"}};
    case Kind::word:
        return {{"enum", rule.words}};
    case Kind::sentence:
        return {{"type", "string"}, {"pattern", rule.pattern}};
    case Kind::integer:
        return bounded(rule, "integer");
    case Kind::number:
        return bounded(rule, "number");
    case Kind::truth:
        return {{"type", "boolean"}};
    case Kind::quantity:
        return {{"type", "string"}, {"pattern", quantity_pattern(rule.dimension)}};
    case Kind::quantities:
        return quantities_schema(rule);
    case Kind::anything:
        return Json::object();
    case Kind::map:
        return map_schema(rule);
    case Kind::list:
        return {{"type", "array"},
                {"minItems", rule.least_items},
                {"items", schema_of(rule.members[0])}};
    case Kind::dictionary:
        return {{"type", "object"}, {"additionalProperties", schema_of(rule.members[0])}};
    case Kind::alternatives:
    case Kind::either:
        break;
    }
    Json choices = Json::array();
    for (const Rule& choice : rule.members)
        choices.push_back(schema_of(choice));
    return {{"anyOf", choices}};
}

Json schema_of(const Rule& rule) {
    Json schema = form_of(rule);
    const std::string text = description(rule);
    if (!text.empty()) schema["description"] = text;
    return schema;
}

} // namespace

std::string json_schema(const Rule& rules, const std::string& title) {
    Json schema = {{"$schema", "https://json-schema.org/draft/2020-12/schema"}, {"title", title}};
    schema.update(schema_of(rules));
    return schema.dump(2) + "\n";
}

std::string json_schema() {
    return json_schema(case_rules(), "rille case file");
}

} // namespace rille::engine
