// SPDX-License-Identifier: Apache-2.0
#include "engine/study/study_schema.hpp"

#include "engine/case_schema.hpp"

namespace rille::engine {

namespace {

using D = Dimension;

constexpr double most_points = 1000000;

Rule vary_rule() {
    const Rule list = list_rule("", anything_rule("", "one value, as in the case file"),
                                "values, as they would stand in the case file");
    const Rule range =
        map_rule("",
                 {anything_rule("from", "first value, as in the case file").required(),
                  anything_rule("to", "last value, in the same unit").required(),
                  integer_rule("points", {2, most_points},
                               "how many values, both ends among them; only in "
                               "a full grid"),
                  word_rule("scale", {"linear", "log"}, "linear: equal steps; log: equal ratios")
                      .by_default("linear")},
                 "values from one to another");
    return dictionary_rule("vary", either_rule("", {list, range}, "a list of values, or a range"),
                           "what is varied: paths of the case file, through names, with values");
}

Rule plan_rule() {
    const Rule points = integer_rule("points", {1, most_points}, "how many points").required();
    return either_rule(
        "plan",
        {word_rule("", {"full grid"}, "every value with every other"),
         map_rule("",
                  {map_rule("latin hypercube",
                            {points, integer_rule("seed", {0, 9007199254740991.0},
                                                  "another seed, other points")
                                         .by_default("1")},
                            "every axis is divided into as many parts as there are points, and "
                            "each part is met once"),
                   map_rule("sobol", {points}, "the first points of the Sobol sequence"),
                   text_rule("table", "CSV with one row a point; the first row names the paths, "
                                      "with units in brackets")},
                  "one of latin hypercube, sobol and table")},
        "which combinations are run");
}

Rule linked_rule() {
    const Rule table = text_rule("", "CSV; the first row names both columns, with units in "
                                     "brackets");
    return dictionary_rule(
        "linked",
        either_rule(
            "",
            {table,
             map_rule("",
                      {text_rule("table", "CSV; the first row names the columns, with units in "
                                          "brackets")
                           .required(),
                       text_rule("column", "column with the values; default: the one named like "
                                           "the path"),
                       text_rule("by", "what is varied and joins the rows; default: the one axis "
                                       "that the table names"),
                       word_rule("between", {"nothing", "linear"},
                                 "nothing: every value must stand in the table; linear: "
                                 "interpolated between two rows, never beyond the table")
                           .by_default("nothing"),
                       quantity_rule("tolerance", D::share, {0, 0.1},
                                     "by which a value may miss that of its row")
                           .by_default("0.01 %")},
                      "a table with what is said about its use")},
            "a table that gives the value for each value of an axis"),
        "paths of the case file whose values follow an axis by a table");
}

Rule answer_rule() {
    return map_rule("answer",
                    {text_rule("y", "a metric of the result: bottom cd_loss, or cd_loss of line "
                                    "at bottom")
                         .required(),
                     text_rule("x", "what is varied along the curve").required(),
                     text_rule("line_per", "what is varied from line to line")},
                    "the curve that is asked for");
}

Rule compare_rule() {
    return map_rule(
        "compare",
        {text_rule("measured", "CSV of measured rows").required(),
         list_rule("join", text_rule("", "what is varied"),
                   "what is varied and named in the table: rows with the same values belong to "
                   "the point")
             .required(),
         text_rule("value", "column of the measured value").required(),
         text_rule("sigma", "column of its standard deviation"),
         text_rule("sites", "column of the number of sites"),
         quantity_rule("tolerance", D::share, {0, 0.1}, "by which joined numbers may differ")
             .by_default("1e-4 %")},
        "measured rows that are laid beside the points");
}

Rule keep_rule() {
    const std::vector<std::string> parts = {"metrics", "last profile", "picture",
                                            "history", "frames",       "all"};
    const auto words = [&](const std::string& key, const std::string& meaning) {
        return either_rule(key,
                           {word_rule("", parts, meaning),
                            list_rule("", word_rule("", parts, "one part"), meaning).items(0)},
                           meaning);
    };
    const Rule both = map_rule("",
                               {words("each", "of a point that came to its end"),
                                words("failed", "of a point that did not")},
                               "for points that came to their end and for those that did not");
    Rule rule = words("keep", "what each point leaves of its run");
    rule.members.push_back(both);
    return rule;
}

Rule slurm_rule() {
    return map_rule(
        "slurm",
        {text_rule("partition", "default: the cluster's"),
         text_rule("account", "default: the cluster's"), text_rule("qos", "default: the cluster's"),
         text_rule("constraint", "nodes that are good for it; default: any"),
         sentence_rule("time", "X per point, or from check",
                       "^(from check|[0-9.eE+-]+ *(s|min|h) +per +point)$",
                       "how long one point takes at most")
             .by_default("from check"),
         sentence_rule("memory", "N MB, N GB, or from check", "^(from check|[0-9.eE+-]+ *(MB|GB))$",
                       "for one task")
             .by_default("from check"),
         integer_rule("points_per_task", {1, most_points}, "run one after the other")
             .by_default("1"),
         integer_rule("cpus_per_task", {1, 4096}, "threads of one task").by_default("1"),
         sentence_rule("at_most", "N tasks", "^[0-9]+( +tasks?)?$",
                       "tasks at the same time; default: no limit"),
         list_rule("lines", text_rule("", "one line"),
                   "lines of the job script, for example module load gcc/12")
             .items(0),
         quantity_rule("warn_before_kill", D::time, zero_or_more(),
                       "the cluster's signal comes so long before the end of the time")
             .by_default("120 s"),
         map_rule("retries",
                  {integer_rule("killed", {0, 100}, "of a point that was killed").by_default("2"),
                   refused_rule("numerics", "a point that failed in numerics would fail again, bit "
                                            "for bit; change the case (spacing, "
                                            "sampling.renew_after), then --retry failed")},
                  "how often a point is run again")
             .by_default("{}")},
        "how points are handed to a Slurm cluster");
}

} // namespace

const Rule& study_rules() {
    static const Rule rules = map_rule(
        "",
        {integer_rule("format", {1, 1}, "version of this form").required(),
         text_rule("title", "one line that says what the study is").by_default("untitled"),
         text_rule("base", "case file that is varied, relative to this file").required(),
         vary_rule(), plan_rule().by_default("full grid"), linked_rule(),
         integer_rule("repeats", {1, 1000}, "how often each point is run, each with its own seed")
             .by_default("1"),
         answer_rule(), compare_rule(), keep_rule(), slurm_rule()},
        "a study: one case with some of its values varied");
    return rules;
}

std::string study_json_schema() {
    return json_schema(study_rules(), "rille study file");
}

} // namespace rille::engine
