// SPDX-License-Identifier: Apache-2.0
// An accuracy that was asked for, against the limit of fine grids.
#include "engine/case_file.hpp"
#include "engine/grid_search.hpp"
#include "tests/support/run_quietly.hpp"

#include <catch2/catch.hpp>

#include <cmath>

using namespace rille;
using namespace rille::tests;

namespace {

/// A short etch of silicon by chlorine with an accuracy of 0.5 nm in place of a spacing.
const std::string base = R"(format: 1
title: short etch
symmetry: extruded
pitch: 80 nm
sides: mirror
accuracy: {cd: 0.5 nm}
stack:
  - {name: gate, material: Si, thickness: 50 nm}
  - {name: bulk, material: Si, thickness: semi-infinite}
mask:
  material: resist
  thickness: 30 nm
  sidewall_angle: 90 deg
  openings:
    - {name: opening, shape: trench, cd: 40 nm, cd_at: mask bottom}
plasmas:
  main:
    pressure: 8 mTorr
    flows: {Cl2: 80 sccm, Ar: 40 sccm}
    gas_temperature: 400 K
    electron_temperature: 3 eV
    ion_flux: 1.1 mA/cm2
    ions: {Cl2+: 70 %, Ar+: 30 %}
    ion_transverse_temperature: 0.3 eV
    neutrals:
      Cl: {flux: 3e18 /cm2/s, temperature: 400 K}
    rf_bias: {frequency: 13.56 MHz, amplitude: 115 V}
chemistry: silicon-cl2-ar
recipe:
  wafer_temperature: 50 degC
  steps:
    - {name: main, plasma: main, time: 6 s}
measure:
  cd: {top: 5 nm below gate top, middle: 12 nm below gate top}
sampling: {ions_per_species: 2048}
)";

std::string with(std::string text, const std::string& given, const std::string& wanted) {
    const std::size_t at = text.find(given);
    REQUIRE(at != std::string::npos);
    return text.replace(at, given.size(), wanted);
}

engine::Metrics run(const engine::Case& c) {
    const engine::RunResult result = run_quietly(c);
    REQUIRE_FALSE(result.error);
    return engine::measure(c, result.last);
}

/// The search that `rille run` makes, to its end: case and metrics with their grid errors.
std::pair<engine::Case, engine::Metrics> searched(const engine::Case& asked) {
    engine::GridSearch search(asked);
    const std::atomic<bool> stop{false};
    engine::Metrics metrics;
    for (;;) {
        const auto next = engine::run_companions(search, {}, stop);
        REQUIRE(next);
        if (next->kind == engine::GridSearch::Next::Kind::end) {
            WARN(search.summary());
            CHECK(search.is_met());
            return {next->the_case, metrics};
        }
        metrics = run(next->the_case);
        search.add(*next, metrics, "", 0);
        search.assess(next->the_case, metrics);
    }
}

engine::Case on_grid(engine::Case c, int cells) {
    c.domain.spacing = c.domain.width_x() / cells;
    c.domain.cells_x = cells;
    return c;
}

bool is_cd(const engine::Metric& m) {
    return m.value && m.name.size() > 3 && m.name.compare(m.name.size() - 3, 3, " cd") == 0;
}

void check_accuracy(const std::string& text) {
    const engine::Case asked = engine::parse_case(text, "case.yaml", RILLE_ROOT);
    const auto [chosen, metrics] = searched(asked);
    const int cells = chosen.domain.cells_x;
    const engine::Metrics fine = run(on_grid(chosen, 2 * cells));
    const engine::Metrics finer = run(on_grid(chosen, 3 * cells));
    const engine::Metrics rough = run(on_grid(chosen, std::max(4, cells / 8)));
    double largest = 0, largest_rough = 0;
    int cds = 0, outside = 0;
    for (const engine::Metric& m : metrics.metrics) {
        if (!is_cd(m)) continue;
        const double truth =
            3 * finer.find(m.name)->value.value() - 2 * fine.find(m.name)->value.value();
        WARN(m.name << " " << *m.value << " +- " << m.error() << " nm, limit " << truth);
        CHECK(std::fabs(*m.value - truth) < 0.5);
        outside += std::fabs(*m.value - truth) > m.error();
        largest = std::max(largest, std::fabs(*m.value - truth));
        if (const auto coarse = rough.find(m.name)->value)
            largest_rough = std::max(largest_rough, std::fabs(*coarse - truth));
        ++cds;
    }
    WARN("largest error " << largest << " nm on " << cells << " cells, " << largest_rough
                          << " on an eighth of them");
    CHECK(cds >= 3);
    CHECK(outside <= 1);
    CHECK(largest_rough > 0.5);
}

} // namespace

// Oracle: the limit of spacing zero from grids two and three times finer than the one chosen.
// Source: Richardson extrapolation, errors taken to be linear in the spacing (common practice, no
// source). Costs two minutes.
// Tolerance: what was asked, 0.5 nm, of every CD; one in three may lie outside the error stated of
// it (of 95 %; the widest CD of the tapered mask is 0.23 nm off and states 0.20). An eighth of the
// cells must miss what was asked.
TEST_CASE("a tapered mask is etched to the accuracy asked", "[validation][accuracy][long]") {
    check_accuracy(with(base, "sidewall_angle: 90 deg", "sidewall_angle: 84 deg"));
}

TEST_CASE("few radicals and spread ions are etched to the accuracy asked",
          "[validation][accuracy][long]") {
    check_accuracy(with(with(base, "flux: 3e18", "flux: 1e18"),
                        "ion_transverse_temperature: 0.3 eV",
                        "ion_transverse_temperature: 0.6 eV"));
}

TEST_CASE("a round via is etched to the accuracy asked", "[validation][accuracy][long]") {
    check_accuracy(with(with(base, "symmetry: extruded", "symmetry: revolved"), "shape: trench",
                        "shape: round"));
}
