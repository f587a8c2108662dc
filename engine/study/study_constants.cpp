// SPDX-License-Identifier: Apache-2.0
// What a study leaves as it is though it would change on a tool, and the study as understood.
#include "engine/study/study_plan.hpp"

#include "engine/words.hpp"

#include <fmt/format.h>

#include <algorithm>

namespace rille::engine {

namespace {

bool is_below(const std::string& path, const std::string& stem) {
    return path == stem || path.rfind(stem + ".", 0) == 0;
}

/// One plasma whose set points are varied.
struct PlasmaReview {
    StudyReading& r;
    const std::string& name;
    const Entry& entry;
    const Case& first; ///< case of the first point, which has all keys that are varied

    std::string stem() const { return "plasmas." + name + "."; }

    bool is_varied(const std::string& key) const {
        for (const StudyColumn& column : r.study.columns)
            if (is_below(column.path, stem() + key) || is_below(stem() + key, column.path))
                return true;
        return false;
    }

    /// Keys below this plasma that an axis changes and that stand for one of these set points.
    std::vector<std::string> causes(const std::vector<std::string>& keys) const {
        std::vector<std::string> found;
        for (const StudyColumn& column : r.study.columns) {
            if (column.is_linked) continue;
            for (const std::string& key : keys)
                if (is_below(column.path, stem() + key))
                    found.push_back(column.path.substr(stem().size()));
        }
        return found;
    }

    static std::string all_of(const std::vector<std::string>& words) {
        std::string text;
        for (std::size_t w = 0; w < words.size(); ++w)
            text += (w == 0 ? "" : w + 1 == words.size() ? " and " : ", ") + words[w];
        return text;
    }

    void constant(const std::string& what, const std::string& value,
                  const std::vector<std::string>& by) const {
        const char* stays = what.rfind("shares", 0) == 0 ? "stay" : "stays";
        r.study.constants.push_back(fmt::format("{} of {} {} {} while {} {}", what, name, stays,
                                                value, all_of(by),
                                                by.size() > 1 ? "change" : "changes"));
    }

    /// Says that a value stays, if it is there and nothing varies it.
    bool stays(const std::string& key, const std::vector<std::string>& by) const {
        const Entry& value = entry[key];
        if (!value.is_good || value.text.empty() || is_varied(key)) return false;
        if (!value.is_given && key != "electron_temperature") return false;
        constant(key, value.text, by);
        return true;
    }

    std::vector<std::string> neutrals_that_stay(const std::vector<std::string>& by) const {
        std::vector<std::string> kept;
        for (const auto& [species, neutral] : entry["neutrals"].members)
            for (const char* key : {"flux", "partial_pressure"}) {
                const Entry& value = neutral[key];
                if (!value.is_given || is_varied("neutrals." + species + "." + key)) continue;
                constant(fmt::format("{} of {}", key, species), value.text, by);
                kept.push_back(fmt::format("{} of {}", key, species));
            }
        return kept;
    }

    /// Pressure, flows and source power decide how much of everything there is.
    void review_gas() const {
        const auto by = causes({"pressure", "flows", "source_power", "source_frequency"});
        if (by.empty()) return;
        std::vector<std::string> warned;
        for (const char* key : {"ion_flux", "electron_density"})
            if (stays(key, by)) warned.emplace_back(key);
        stays("electron_temperature", by);
        if (!entry["ions"].members.empty() && !is_varied("ions"))
            constant("shares of ions", "as they are", by);
        for (const std::string& kept : neutrals_that_stay(by))
            warned.push_back(kept);
        for (const auto& [gas, split] : entry["dissociation"].members)
            if (!is_varied("dissociation." + gas))
                constant("dissociation of " + gas, split["fraction"].text, by);
        if (entry["ion_energies"].is_given && !is_varied("ion_energies"))
            constant("ion_energies", "as in the table", by);
        for (const char* key : {"self_bias", "mean_sheath"})
            if (entry["rf_bias"][key].is_given && !is_varied(std::string("rf_bias.") + key))
                constant(std::string("rf_bias.") + key, entry["rf_bias"][key].text, by);
        if (!warned.empty())
            r.study.warnings.push_back(fmt::format(
                "{} of {} {} while {} {}; on a tool {} with it: link what was measured (linked: "
                "{{plasmas.{}.{}: table.csv}})",
                all_of(by), name, by.size() > 1 ? "vary" : "varies", all_of(warned),
                warned.size() > 1 ? "stay" : "stays",
                warned.size() > 1 ? "they change" : "it changes", name,
                entry["ion_flux"].is_given ? "ion_flux" : "electron_density"));
    }

    void review_bias() const {
        const auto by = causes({"rf_bias"});
        if (by.empty()) return;
        for (const char* key : {"ion_flux", "electron_density"})
            stays(key, by);
    }

    void review_unused() const {
        const Plasma& plasma = first.plasmas.at(name);
        for (const std::string& unused : plasma.unused) {
            const std::string key = unused.substr(0, unused.find(':'));
            for (std::size_t c = 0; c < r.study.columns.size(); ++c) {
                if (r.study.columns[c].path != stem() + key) continue;
                const bool links =
                    std::any_of(r.plan.linked.begin(), r.plan.linked.end(),
                                [&](const LinkedColumn& link) { return link.by == c; });
                r.study.warnings.push_back(
                    fmt::format("{} of {} is not used by the model: {}", key, name,
                                links ? "only what is linked to it changes"
                                      : "points that differ in it alone give the same result"));
            }
        }
    }
};

/// The mask between openings takes up what an opening gains, for the pitch stays.
void review_pitch(StudyReading& r) {
    std::vector<std::string> by;
    for (const StudyColumn& column : r.study.columns) {
        if (column.path == "pitch") return;
        const std::string end = column.path.substr(column.path.rfind('.') + 1);
        if (is_below(column.path, "mask.openings") && (end == "cd" || end == "space"))
            by.push_back(column.label);
    }
    if (by.empty()) return;
    r.study.constants.push_back(fmt::format(
        "pitch stays {} while {} {}: the mask beside the opening takes up the difference",
        r.base_root["pitch"].text, PlasmaReview::all_of(by), by.size() > 1 ? "change" : "changes"));
}

/// Steps of a given time etch less or more deeply where the rate is varied.
void review_times(StudyReading& r) {
    const auto& columns = r.study.columns;
    const bool has_other_rates = std::any_of(columns.begin(), columns.end(), [](const auto& c) {
        return is_below(c.path, "plasmas") || is_below(c.path, "mask.openings") ||
               is_below(c.path, "recipe.wafer_temperature") || c.path == "chemistry";
    });
    if (!has_other_rates) return;
    for (const RecipeStep& step : r.study.base.steps) {
        const std::string path = "recipe.steps." + step.name + ".time";
        const bool is_varied = std::any_of(columns.begin(), columns.end(),
                                           [&](const auto& c) { return c.path == path; });
        if (step.end.kind == StepEnd::Kind::time && !is_varied)
            r.study.constants.push_back(
                fmt::format("time of step {} stays {:.6g} s in every point, so what it etches differs",
                            step.name, step.end.time_s));
    }
}

Entry* member_of(Entry* entry, const std::string& key) {
    if (!entry) return nullptr;
    for (auto& [name, value] : entry->members)
        if (name == key) return &value;
    return nullptr;
}

} // namespace

void list_constants(StudyReading& r) {
    Problems none;
    const Case first = build_point(r.study, 0, false, none).result;
    for (const auto& [name, entry] : r.base_root["plasmas"].members) {
        const PlasmaReview review{r, name, entry, first};
        review.review_gas();
        review.review_bias();
        review.review_unused();
    }
    review_pitch(r);
    review_times(r);
    if (r.study.columns.empty()) r.study.warnings.emplace_back("nothing is varied: one point");
}

void write_resolved(StudyReading& r) {
    Entry root = r.root;
    member_of(&root, "base")->text = "base/case.yaml";
    const auto use_copy = [&](Entry* file) {
        if (!file || !file->is_given) return;
        if (const auto path = keep_table(r, *file)) file->text = keep_input(r.study, *path);
    };
    use_copy(member_of(member_of(&root, "plan"), "table"));
    use_copy(member_of(member_of(&root, "compare"), "measured"));
    if (Entry* linked = member_of(&root, "linked"))
        for (auto& [path, entry] : linked->members)
            use_copy(entry.rule->kind == Rule::Kind::text ? &entry : member_of(&entry, "table"));
    r.study.resolved_yaml = to_yaml(root);
}

} // namespace rille::engine
