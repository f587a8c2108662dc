// SPDX-License-Identifier: Apache-2.0
#include "engine/case_file.hpp"
#include "engine/grid_search.hpp"
#include "engine/output_folder.hpp"

#include <catch2/catch.hpp>

#include <cmath>
#include <nlohmann/json.hpp>

using namespace rille::engine;
using Kind = GridSearch::Next::Kind;

namespace {

const char* const shipped = RILLE_ROOT "/examples/poly-trench/case.yaml";

GridRun run_with(double spacing, double cd, const std::string& definition = "at z = -10 nm") {
    GridRun run;
    run.spacing = spacing;
    run.metrics = {{"top cd", "trench", cd, "nm", 0.05, definition, "", {}}};
    return run;
}

Metrics metrics_with(double cd, double sampling) {
    Metrics metrics;
    metrics.metrics = {{"top cd", "trench", cd, "nm", sampling, "at z = -10 nm", "", {}}};
    return metrics;
}

Case with_accuracy(const std::string& cd) {
    std::string text = read_file(shipped);
    const std::string given = "spacing: 2 nm";
    text.replace(text.find(given), given.size(), "accuracy: {cd: " + cd + "}");
    return parse_case(text, shipped, RILLE_ROOT "/examples/poly-trench");
}

/// Answers of a case whose CD is 60 nm + slope spacing, and whose sampling error is 0.4 nm with
/// 8,192 ions.
Metrics answer(const Case& c, double slope) {
    return metrics_with(60 + slope * c.domain.spacing,
                        0.4 * std::sqrt(8192.0 / c.ions_per_species));
}

/// Follows a search to its end; the grids in their order.
std::vector<std::string> follow(GridSearch& search, double slope, int most = 40) {
    std::vector<std::string> order;
    for (int i = 0; i < most; ++i) {
        const GridSearch::Next next = search.next();
        if (next.kind == Kind::end) break;
        order.push_back((next.kind == Kind::main ? "main " : "") +
                        std::to_string(next.the_case.domain.cells_x) + "/" +
                        std::to_string(next.the_case.ions_per_species));
        search.add(next, answer(next.the_case, slope), "", 1);
    }
    return order;
}

} // namespace

TEST_CASE("the grid error of a value that is linear in the spacing", "[engine][grid]") {
    std::vector<GridRun> companions;
    for (const double h : {1.4, 1.9, 2.0, 2.1, 2.2})
        companions.push_back(run_with(h, 60 + 0.3 * h));
    std::vector<Metric> own = run_with(1, 60.3).metrics;
    assess_grid_error(own, 1, true, companions);
    REQUIRE(own[0].grid_error);
    CHECK(*own[0].grid_error == Approx(0.3).epsilon(1e-9));
    CHECK(own[0].error() == Approx(std::hypot(0.3, 0.05)));

    SECTION("scatter counts beside the trend") {
        companions[1].metrics[0].value = 60 + 0.3 * 1.9 + 2;
        assess_grid_error(own, 1, true, companions);
        CHECK(*own[0].grid_error > 0.5);
    }
    SECTION("a grid with the edges where the own one has them counts alone") {
        companions[2].metrics[0].value = 60 + 0.3 * 2 + 0.5; // tells 0.8, 0.8 and 0.3 as mean
        companions[3].metrics[0].value = 60 + 0.3 * 2.1 - 0.5;
        assess_grid_error(own, 1, true, companions);
        const double without = *own[0].grid_error;
        companions[2].edge_offset = 0;
        assess_grid_error(own, 1, true, companions);
        CHECK(*own[0].grid_error > without + 0.1);
    }
    SECTION("too few grids of twice the spacing leave the line") {
        companions[1].spacing = companions[2].spacing = 1.5;
        for (int i : {1, 2})
            companions[i].metrics[0].value = 60 + 0.3 * 1.5;
        assess_grid_error(own, 1, true, companions);
        CHECK(*own[0].grid_error == Approx(0.3).epsilon(1e-9));
    }
    SECTION("the widest CD is no surer than all the others") {
        own.push_back(own[0]);
        own.back().name = "bow cd";
        for (GridRun& run : companions) {
            run.metrics.push_back(run.metrics[0]);
            run.metrics.back().name = "bow cd";
            run.metrics.back().value = 60.3; // the same on all grids
        }
        assess_grid_error(own, 1, true, companions);
        CHECK(*own[1].grid_error == Approx(0.3).epsilon(1e-9));
    }
    SECTION("another definition under the same name is another quantity") {
        for (GridRun& run : companions)
            run.metrics[0].definition = "at z = -20 nm";
        assess_grid_error(own, 1, true, companions);
        CHECK_FALSE(own[0].grid_error);
    }
    SECTION("three grids are too few") {
        companions.resize(2);
        assess_grid_error(own, 1, true, companions);
        CHECK_FALSE(own[0].grid_error);
    }
    SECTION("nothing is judged on one spacing alone") {
        for (GridRun& run : companions)
            run.spacing = 1;
        assess_grid_error(own, 1, true, companions);
        CHECK_FALSE(own[0].grid_error);
    }
}

TEST_CASE("a given spacing is run alone, or with companions where asked", "[engine][grid]") {
    GridSearch alone(load_case(shipped));
    CHECK_FALSE(alone.compares());
    CHECK(follow(alone, 0.3) == std::vector<std::string>{"main 80/8192"});
    GridSearch compared(load_case(shipped, {"grid_error=assessed"}));
    // Openings from 50 to 110 nm of 160: 38 and 58 cells have their edges an eighth of a cell from
    // where 80 have them, 40 and 57 half a cell and 0.19.
    CHECK(follow(compared, 0.3) == std::vector<std::string>{"38/8192", "39/8192", "40/8192",
                                                            "41/8192", "58/8192", "main 80/8192"});
    CHECK(compared.is_met());
    CHECK(compared.summary().empty());
    Metrics metrics = answer(load_case(shipped), 0.3);
    compared.assess(load_case(shipped), metrics);
    CHECK(metrics.metrics[0].grid_error == Approx(0.6)); // 0.3 times 2 nm
}

TEST_CASE("a search refines grid and sampling to what was asked", "[engine][grid]") {
    GridSearch search(with_accuracy("0.5 nm"));
    const std::vector<std::string> order = follow(search, 0.6);
    CAPTURE(order);
    CHECK(order.size() < 20);
    CHECK(search.is_met());
    const GridSearch::Next last = search.next();
    REQUIRE(last.kind == Kind::end);
    CHECK(0.6 * last.the_case.domain.spacing <= 0.5);
    CHECK(last.the_case.ions_per_species > 8192);
    CHECK(search.summary().find("asked was 0.5 nm: met") != std::string::npos);

    SECTION("the resolved case of its end leads to the same end at once") {
        GridSearch again(parse_case(last.the_case.shown_yaml, "case.yaml", "."));
        const std::vector<std::string> shorter = follow(again, 0.6);
        CHECK(shorter.size() < order.size());
        CHECK(shorter.back() == order.back());
        CHECK(again.next().the_case.resolved_yaml == last.the_case.resolved_yaml);
    }
    SECTION("a coarse goal takes a coarse grid") {
        GridSearch coarse(with_accuracy("3 nm"));
        follow(coarse, 0.6);
        CHECK(coarse.next().the_case.domain.cells_x < last.the_case.domain.cells_x);
        CHECK(coarse.is_met());
    }
}

TEST_CASE("a search that cannot get there says so", "[engine][grid]") {
    GridSearch search(with_accuracy("0.001 nm"));
    follow(search, 0.6, 200);
    CHECK(search.next().kind == Kind::end);
    CHECK_FALSE(search.is_met());
    CHECK(search.summary().find("not met") != std::string::npos);
}

TEST_CASE("a search goes on from what was written to the same end", "[engine][grid]") {
    const Case asked = with_accuracy("0.5 nm");
    GridSearch whole(asked);
    const std::vector<std::string> order = follow(whole, 0.6);
    for (std::size_t stop = 1; stop < order.size(); ++stop) {
        GridSearch first(asked);
        follow(first, 0.6, static_cast<int>(stop));
        GridSearch second(asked, first.text(), "grids.json");
        const std::vector<std::string> rest = follow(second, 0.6);
        CHECK(std::vector<std::string>(order.begin() + stop, order.end()) == rest);
        CHECK(second.text() == whole.text());
    }
    CHECK_THROWS_AS(GridSearch(asked, "{\"runs\": [1]}", "grids.json"), OutputError);
}

TEST_CASE("spacing and accuracy are given one at a time", "[engine][grid]") {
    CHECK_THROWS_WITH(load_case(shipped, {"accuracy={cd: 0.5 nm}"}),
                      Catch::Contains("accuracy chooses the spacing; give one of the two"));
    CHECK_THROWS_WITH(with_accuracy("-1 nm"), Catch::Contains("more than 0 nm"));
    CHECK(with_accuracy("0.5 nm").accuracy_cd_nm == 0.5);
}
