// SPDX-License-Identifier: Apache-2.0
#include "engine/parameters.hpp"

#include "engine/words.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <vector>

namespace rille::engine {

namespace {

using fluxes::Standing;

const std::vector<std::string> standing_words = {"measured", "published", "from memory",
                                                 "illustrative"};

std::optional<Standing> read_standing(const YamlNode& node, Problems& problems) {
    const std::optional<std::string> word = read_word(node, standing_words, problems);
    if (word)
        for (std::size_t i = 0; i < standing_words.size(); ++i)
            if (*word == standing_words[i]) return static_cast<Standing>(i);
    return std::nullopt;
}

std::string form_example(const ParameterForm& form) {
    return fmt::format("{{value: {}, standing: published, source: \"...\"}}",
                       form.dimension ? example(*form.dimension) : "0.5");
}

} // namespace

const char* standing_word(Standing standing) {
    return standing_words[static_cast<std::size_t>(standing)].c_str();
}

std::optional<Parameter> ParameterReader::read(const YamlNode* node, const ParameterForm& form) {
    if (!node) return std::nullopt;
    if (!node->is_map()) {
        problems_.add(node->at, node->path,
                      fmt::format("{} stands where a cited value is due, for example {}",
                                  what_it_is(*node), form_example(form)));
        return std::nullopt;
    }
    const std::size_t before = problems_.size();
    MapReader map(*node, problems_);
    Parameter p;
    if (const YamlNode* value = map.required("value"))
        p.value = (form.dimension ? read_quantity(*value, *form.dimension, form.range, problems_)
                                  : read_number(*value, form.range, problems_))
                      .value_or(0);
    if (form.at)
        if (const YamlNode* at = form.at_required ? map.required("at") : map.optional("at"))
            p.at = read_quantity(*at, *form.at, above_zero(), problems_);
    if (form.activation)
        if (const YamlNode* energy = map.optional("activation"))
            p.activation_ev = read_quantity(*energy, Dimension::energy, zero_or_more(), problems_);
    if (const YamlNode* standing = map.required("standing"))
        p.standing = read_standing(*standing, problems_).value_or(Standing::illustrative);
    if (const YamlNode* source = map.required("source"))
        p.source = read_text(*source, problems_).value_or("");
    map.finish();
    if (problems_.size() != before) return std::nullopt;
    ++counts_[p.standing];
    const bool is_open =
        p.standing == Standing::illustrative || p.standing == Standing::from_memory;
    const bool is_new = std::none_of(open_.begin(), open_.end(), [&](const OpenParameter& known) {
        return known.name == node->path; // a yield is read once for each ion
    });
    if (is_open && is_new) open_.push_back({node->path, p.standing});
    return p;
}

double ParameterReader::value(const YamlNode* node, const ParameterForm& form, double otherwise) {
    const std::optional<Parameter> p = read(node, form);
    return p ? p->value : otherwise;
}

} // namespace rille::engine
