// SPDX-License-Identifier: Apache-2.0
#include "engine/case_schema.hpp"

#include "engine/case_schema_parts.hpp"

namespace rille::engine {

namespace {

using D = Dimension;

const char* const place_pattern =
    "^([0-9.eE+-]+ *(nm|um|angstrom|mm) +(above|below) +.+|middle of +.+|.+ +(top|bottom))$";

Rule stack_rule() {
    const auto film = [](const std::string& key) {
        return map_rule(
            key,
            {text_rule("name", "name of the film, used in places and paths").required(),
             text_rule("material", "what it is made of, as the chemistry names it").required(),
             sentence_rule("thickness", "a length, or semi-infinite for the last",
                           "^(semi-infinite|[0-9.eE+-]+ *(nm|um|angstrom|mm))$",
                           "thickness of the film; the last is semi-infinite")
                 .required()},
            "one film");
    };
    const Rule group = map_rule(
        "*",
        {text_rule("name", "name of the group; its films are called NAME 1 FILM, NAME 2 FILM ...")
             .by_default("pair"),
         integer_rule("repeat", {1, 10000}, "how many times the films follow each other")
             .required(),
         list_rule("films", film(""), "the films of one repeat, top to bottom").required()},
        "films that repeat");
    return list_rule("stack", alternatives_rule("", "repeat", {film(""), group}, "film or group"),
                     "films from top to bottom, starting below the mask")
        .required();
}

Rule opening_rule() {
    const auto with = [](const std::string& shape, std::vector<Rule> own,
                         const std::string& meaning) {
        std::vector<Rule> members = {
            text_rule("name", "name of the opening, used in places and paths").required(),
            word_rule("shape", {shape}, "shape of the opening").required()};
        for (Rule& rule : own)
            members.push_back(rule);
        members.push_back(
            word_rule("cd_at", {"mask bottom", "mask top"}, "height at which cd is given")
                .by_default("mask bottom"));
        members.push_back(quantities_rule("centre", D::length, {},
                                          "centre of the opening (of the array) from the middle "
                                          "of the period: x, or [x, y]")
                              .by_default("0 nm"));
        return map_rule(shape, members, meaning);
    };
    const Rule cd = quantity_rule("cd", D::length, above_zero(), "full width").required();
    const Rule space =
        quantity_rule("space", D::length, above_zero(), "mask between two openings").required();
    return alternatives_rule(
        "", "shape",
        {with("trench", {cd}, "a trench along y"),
         with("lines",
              {cd, space, integer_rule("count", {1, 1000}, "number of openings").required()},
              "an array of trenches with lines of mask between them"),
         with("round", {cd}, "a round hole"),
         with("elliptic",
              {quantities_rule("cd", D::length, above_zero(), "full widths along x and y: [x, y]")
                   .required()
                   .items(2, 2)},
              "an elliptic hole")},
        "one opening");
}

Rule mask_rule() {
    return map_rule(
        "mask",
        {text_rule("material", "what the mask is made of").required(),
         quantity_rule("thickness", D::length, above_zero(), "thickness of the mask").required(),
         quantity_rule("sidewall_angle", D::angle, {0, 180, true, true},
                       "90 deg vertical, below opens upwards, above is re-entrant")
             .by_default("90 deg"),
         quantity_rule("corner_radius", D::length, zero_or_more(), "rounding of the top edge")
             .by_default("0 nm"),
         list_rule("openings", opening_rule(), "what is open in the mask").required(),
         later_rule("layout", "mask layouts are not read; write the openings of one period"),
         later_rule("contour", "drawn mask profiles are not read; give thickness, sidewall_angle "
                               "and corner_radius")},
        "the mask as it stands before the etch");
}

Rule recipe_rule() {
    const Rule until =
        map_rule("until",
                 {text_rule("reaches", "film; ends at first touch at the place"),
                  text_rule("cleared", "film; ends when it is fully exposed over the opening"),
                  sentence_rule("at", "NAME centre or open field", "^(.+ +centre|open field)$",
                                "an opening's centre, or the open field: the flat-film rate")
                      .required()},
                 "ends when a film is met");
    Rule step = map_rule(
        "",
        {text_rule("name", "name of the step").required(),
         text_rule("plasma", "name of the plasma that burns").required(),
         sentence_rule("time", "a time, or N % of STEP",
                       "^([0-9.eE+-]+ *(s|min|ms|us|h)|[0-9.eE+-]+ *% +of +.+)$",
                       "how long; N % of STEP is overetch by the time that step took"),
         until, quantity_rule("no_longer_than", D::time, above_zero(), "ends the step in any case"),
         truth_rule("must_end", "true: reaching no_longer_than fails the run").by_default("false"),
         later_rule("cycle", "cycles are not run; write the steps one by one"),
         later_rule("repeat", "cycles are not run; write the steps one by one")},
        "one step; give time, or until with no_longer_than");
    return map_rule("recipe",
                    {quantity_rule("wafer_temperature", D::temperature, above_zero(),
                                   "temperature of the wafer surface")
                         .required(),
                     list_rule("steps", step, "steps in order").required()},
                    "what is done");
}

Rule target_rule() {
    const char* value_pattern = "^[+-]?[0-9.eE+-]+( *[a-zA-Z]+)?$";
    return either_rule(
        "",
        {sentence_rule("", "at least X, at most X, or X to Y",
                       "^(at least +.+|at most +.+|[^ ]+ *[^ ]* +to +.+)$",
                       "the goal at the end of the run"),
         map_rule("",
                  {sentence_rule("at_least", "X", value_pattern, "lowest value that will do"),
                   sentence_rule("at_most", "X", value_pattern, "highest value that will do"),
                   text_rule("after", "step of the recipe at whose end the goal holds; default: "
                                      "the end of the run")},
                  "the goal at the end of a step")},
        "the goal");
}

Rule measured_rule() {
    return map_rule(
        "measured",
        {text_rule("contour", "CSV of a section: x_nm, z_nm or x_px, y_px (y down)"),
         sentence_rule("scale", "X nm/px", "^[0-9.eE+-]+ *nm/px$",
                       "size of a pixel of the contour"),
         sentence_rule("origin", "X, Y px or X, Z nm", "^[^,]+,[^,]+(px|nm)$",
                       "the point of the contour that lies on the feature's axis at the mask "
                       "bottom as drawn; default 0, 0"),
         quantity_rule("rotation", D::angle, {-180, 180}, "turns the contour anticlockwise"),
         sentence_rule("cut_offset", "X or X to Y", "^[^ ].* *(nm|um|angstrom)$",
                       "distance of the section from the axis of a hole"),
         text_rule("feature", "opening that the contour shows; default: the first"),
         text_rule("cd_table", "CSV: cd, mean_nm, sigma_nm, sites; with feature in front where "
                               "there are several openings")},
        "measured profile and CDs, laid over the result");
}

Rule accuracy_rule() {
    return map_rule(
        "accuracy",
        {quantity_rule("cd", D::length, above_zero(),
                       "error that every CD may have: 95 % sampling error and grid error together")
             .required(),
         quantity_rule("spacing", D::length, above_zero(),
                       "where the search for the spacing starts; a run notes here what it found")},
        "in place of spacing: grid and sampling are refined until the CDs are so sure");
}

Rule start_rule() {
    return map_rule(
        "start",
        {text_rule("contour", "CSV of the surface to start from, from side to side with the gas on "
                              "the left: x_nm, z_nm or x_px, y_px (y down), or profile.csv of a "
                              "run")
             .required(),
         sentence_rule("scale", "X nm/px", "^[0-9.eE+-]+ *nm/px$", "size of a pixel"),
         sentence_rule("origin", "X, Y px or X, Z nm", "^[^,]+,[^,]+(px|nm)$",
                       "the point of the contour that lies in the middle of the period at the mask "
                       "bottom as drawn; default 0, 0"),
         quantity_rule("rotation", D::angle, {-180, 180}, "turns the contour anticlockwise")},
        "what the etch starts from, instead of mask and stack as drawn; mask and stack still say "
        "which material lies where");
}

std::vector<Rule> later_rules() {
    const char* study = "belongs into a study file, which names this case as its base: rille study";
    std::vector<Rule> rules = {
        later_rule("layout", "mask layouts are not read; write mask.openings"),
        refused_rule("contour", "a contour to start from is named under start: {contour: FILE}"),
        later_rule("fit", "parameters are not fitted; leave it out")};
    for (const char* key : {"base", "vary", "compare", "plan", "linked", "answer", "keep", "slurm"})
        rules.push_back(refused_rule(key, study));
    return rules;
}

Rule make_case_rules() {
    const Rule symmetry =
        word_rule("symmetry", {"extruded", "revolved", "full"},
                  "extruded: trenches and lines; revolved: one round hole about the axis of a "
                  "round cell; full: anything that repeats in x and y")
            .required();
    Rule targets = dictionary_rule("targets", target_rule().required(),
                                   "goals for measured quantities, by their names");
    Rule root = map_rule(
        "",
        {integer_rule("format", {1, 1}, "version of this form").required(),
         text_rule("title", "one line that says what the case is").by_default("untitled"),
         symmetry,
         quantities_rule("pitch", D::length, above_zero(),
                         "width of the simulated period; revolved: diameter of the cell; full: one "
                         "length or [x, y]")
             .required(),
         word_rule("sides", {"mirror", "periodic"}, "what lies beyond the period")
             .by_default("mirror"),
         quantity_rule("spacing", D::length, above_zero(),
                       "grid spacing; rounded so that a whole number of cells fills the pitch; or "
                       "give accuracy"),
         accuracy_rule(),
         word_rule("grid_error", {"assessed", "not assessed"},
                   "assessed: the same case is run on coarser grids too, which bounds the error "
                   "that the grid makes; always so under accuracy")
             .by_default("not assessed"),
         stack_rule(),
         map_rule("liner",
                  {text_rule("material", "what the liner is made of").required(),
                   quantity_rule("thickness", D::length, above_zero(), "the same on every surface")
                       .required()},
                  "conformal film over mask and stack at the start"),
         mask_rule(),
         start_rule(),
         dictionary_rule("tool_log", anything_rule("", "as written"),
                         "set points kept with the result, not used by the model"),
         dictionary_rule("plasmas", plasma_rule().required(), "states of the plasma, by name")
             .required(),
         text_rule("chemistry", "name of a chemistry in configs, or path of a YAML file")
             .required(),
         recipe_rule().required(),
         map_rule(
             "measure",
             {dictionary_rule("cd",
                              sentence_rule("", "X above PLACE, X below PLACE or middle of FILM",
                                            place_pattern, "height")
                                  .required(),
                              "heights at which the CD is measured, by label")
                  .by_default("{}")},
             "what is measured beyond the standard list")
             .by_default("{}"),
         targets,
         measured_rule(),
         map_rule("frames",
                  {quantity_rule("every", D::time, above_zero(),
                                 "time between two frames; default: ten frames a run")},
                  "how often the shape is written")
             .by_default("{}"),
         map_rule("arc_data",
                  {quantities_rule("at", D::time, zero_or_more(),
                                   "times of the run: one, or a list [10 s, 20 s]")
                       .items(1, 1000)
                       .required()},
                  "when arrivals, coverages and rates with their causes are written along the "
                  "surface"),
         map_rule("sampling",
                  {quantity_rule("renew_after", D::share, {0, 4, true, false},
                                 "share of a cell that the front moves before arrivals are traced "
                                 "again, less where they change fast; smaller is slower; 50 %, in "
                                 "revolved 200 % if not given"),
                   integer_rule("rays_per_point", {8, 1048576},
                                "rays from each surface point for neutrals, a multiple of 8")
                       .by_default("64"),
                   integer_rule("ions_per_species", {8, 1073741824.0},
                                "ions followed for reflections, a multiple of 8")
                       .by_default("8192"),
                   integer_rule("seed", {0, 9007199254740991.0}, "same seed, same bits")
                       .by_default("1")},
                  "how finely arrivals are sampled")
             .by_default("{}")},
        "a case: one etch from a film stack to a profile");
    for (Rule& rule : later_rules())
        root.members.push_back(std::move(rule));
    return root;
}

} // namespace

const Rule& case_rules() {
    static const Rule rules = make_case_rules();
    return rules;
}

} // namespace rille::engine
