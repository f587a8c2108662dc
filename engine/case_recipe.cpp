// SPDX-License-Identifier: Apache-2.0
#include "engine/case_build.hpp"

#include "engine/words.hpp"

#include <fmt/format.h>

#include <algorithm>

namespace rille::engine {

namespace {

struct StepBuilder {
    const Entry& entry;
    Case& result;
    Problems& problems;
    RecipeStep step;

    void build() {
        step.name = entry["name"].text;
        step.plasma = entry["plasma"].text;
        const Entry& plasma = entry["plasma"];
        if (plasma.is_good && !result.plasmas.empty() && !result.plasmas.count(step.plasma)) {
            std::vector<std::string> names;
            for (const auto& [name, unused] : result.plasmas)
                names.push_back(name);
            problems.add(plasma.at, plasma.path,
                         fmt::format("no plasma is called {}; there are: {}{}", quoted(plasma.text),
                                     listed(names), did_you_mean(plasma.text, names)));
        }
        const Entry& time = entry["time"];
        const Entry& until = entry["until"];
        if (time.is_given && until.is_given)
            problems.add(until.at, until.path, "a step has either time or until, not both");
        else if (time.is_given)
            build_time(time);
        else if (until.is_given)
            build_until(until);
        else
            problems.add(entry.at, entry.path,
                         "nothing ends the step; give time, or until with no_longer_than");
        if (!until.is_given) refuse_without_until();
    }

    void refuse_without_until() {
        for (const char* key : {"no_longer_than", "must_end"})
            if (entry[key].is_given && entry[key].number != 0)
                problems.add(entry[key].at, entry[key].path,
                             "belongs to a step with until; this one ends by its time");
    }

    void build_time(const Entry& time) {
        if (!time.is_good) return;
        const std::size_t of = time.text.find(" of ");
        if (of == std::string::npos) {
            const QuantityText value = parse_quantity(time.text, Dimension::time);
            const bool is_share = time.text.find('%') != std::string::npos;
            if (is_share)
                problems.add(
                    time.at, time.path,
                    fmt::format("{}: per cent of what? Write \"30 % of main\"", quoted(time.text)));
            else if (!value.error.empty())
                problems.add(time.at, time.path, value.error + ", or N % of STEP");
            else if (!(value.value > 0))
                problems.add(
                    time.at, time.path,
                    fmt::format("{} is out of range; allowed is more than 0 s", quoted(time.text)));
            step.end.time_s = value.value;
            return;
        }
        step.end.kind = StepEnd::Kind::share_of_step;
        step.end.of_step = trimmed(time.text.substr(of + 4));
        const QuantityText share = parse_quantity(time.text.substr(0, of), Dimension::share);
        if (!share.error.empty())
            problems.add(time.at, time.path, share.error);
        else if (!(share.value > 0))
            problems.add(time.at, time.path, "the share must be more than 0 %");
        step.end.share = share.value;
        check_earlier_step(time);
    }

    void check_earlier_step(const Entry& time) {
        std::vector<std::string> earlier;
        for (const RecipeStep& done : result.steps)
            earlier.push_back(done.name);
        if (std::find(earlier.begin(), earlier.end(), step.end.of_step) != earlier.end()) return;
        problems.add(time.at, time.path,
                     fmt::format("no earlier step is called {}{}{}", quoted(step.end.of_step),
                                 earlier.empty() ? "" : "; there are: " + listed(earlier),
                                 did_you_mean(step.end.of_step, earlier)));
    }

    void build_until(const Entry& until) {
        if (!until.is_good) return;
        const Entry& reaches = until["reaches"];
        const Entry& cleared = until["cleared"];
        if (reaches.is_given == cleared.is_given)
            problems.add(until.at, until.path,
                         reaches.is_given ? "reaches and cleared exclude each other"
                                          : "give reaches: FILM (first touch) or cleared: FILM "
                                            "(fully exposed)");
        const Entry& film = reaches.is_given ? reaches : cleared;
        step.end.kind = reaches.is_given ? StepEnd::Kind::reaches : StepEnd::Kind::cleared;
        step.end.film = film.text;
        if (film.is_good) check_film(film);
        if (until["at"].is_good) build_place(until["at"]);
        const Entry& longest = entry["no_longer_than"];
        step.no_longer_than_s = longest.number;
        step.must_end = entry["must_end"].number != 0;
        if (!longest.is_given)
            problems.add(entry.at, entry.path,
                         "until needs no_longer_than, for example no_longer_than: 150 s");
    }

    void check_film(const Entry& film) {
        const int index = film_index(result, film.text);
        std::vector<std::string> below = film_names(result);
        below.erase(below.begin(),
                    below.begin() + std::min<std::size_t>(result.substrate_first, below.size()));
        if (index < result.substrate_first)
            problems.add(film.at, film.path,
                         fmt::format("no film of the stack is called {}; there are: {}{}",
                                     quoted(film.text), listed(below, 8),
                                     did_you_mean(film.text, below)));
        else if (index == result.substrate_first && result.liner_thickness <= 0)
            problems.add(film.at, film.path,
                         fmt::format("{} is the topmost film: it is reached before the etch",
                                     quoted(film.text)));
    }

    void build_place(const Entry& at) {
        if (at.text == "open field") {
            step.end.at = at.text;
            return;
        }
        std::vector<std::string> places;
        for (const std::string& name : opening_names(result))
            places.push_back(name + " centre");
        places.push_back("open field");
        const std::string tail = " centre";
        const bool centred = at.text.size() > tail.size() &&
                             at.text.compare(at.text.size() - tail.size(), tail.size(), tail) == 0;
        const std::string name = centred ? at.text.substr(0, at.text.size() - tail.size()) : "";
        step.end.at = opening_called(name);
        if (step.end.at.empty() && !result.mask.openings.empty())
            problems.add(at.at, at.path,
                         fmt::format("{} is not a place; there are: {}{}", quoted(at.text),
                                     listed(places, 8), did_you_mean(at.text, places)));
    }

    /// The opening of that name, or the middle one of the array of that name.
    std::string opening_called(const std::string& name) const {
        std::vector<std::string> copies;
        for (const geometry::Opening& opening : result.mask.openings) {
            if (opening.name == name) return name;
            const bool is_copy =
                opening.name.rfind(name + " ", 0) == 0 && !name.empty() &&
                opening.name.find_first_not_of("0123456789", name.size() + 1) == std::string::npos;
            if (is_copy) copies.push_back(opening.name);
        }
        return copies.empty() ? "" : copies[copies.size() / 2];
    }
};

} // namespace

void build_recipe(const Entry& root, Case& result, Problems& problems) {
    const Entry& recipe = root["recipe"];
    result.wafer_temperature_k = recipe["wafer_temperature"].number;
    for (const Entry& entry : recipe["steps"].items) {
        StepBuilder builder{entry, result, problems, {}};
        if (entry.is_good) builder.build();
        result.steps.push_back(builder.step);
    }
    const Entry& every = root["frames"]["every"];
    result.frame_interval_s = every.is_good ? every.number : 0;
    const Entry& arc_data = root["arc_data"]["at"];
    if (arc_data.is_good && arc_data.is_given) result.arc_data_s = arc_data.numbers;
}

} // namespace rille::engine
