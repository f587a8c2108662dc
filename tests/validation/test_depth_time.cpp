// SPDX-License-Identifier: Apache-2.0
#include "tests/support/closed_table.hpp"
#include "tests/support/run_quietly.hpp"
#include "tests/support/trench_case.hpp"

#include "engine/simulation.hpp"
#include "fluxes/surface_chemistry.hpp"

#include <catch2/catch.hpp>

#include <cmath>
#include <map>
#include <string>
#include <vector>

using namespace rille;
using namespace rille::tests;

namespace {

constexpr double opening = 40, mask = 10, open_rate = 1; // nm, nm, nm/s with plenty of ions
constexpr double plenty = 30; ///< adsorbed atoms that the ions could remove, over those that stick
constexpr double first_aspect = mask / opening;

/// Etched area over the width of the opening.
double mean_depth(const geometry::Surface& s) {
    double area = 0;
    for (std::size_t e = 0; e < s.size(); ++e) {
        const auto &a = s.vertices[s.corners[e][0]], &b = s.vertices[s.corners[e][1]];
        if (std::max(a.z, b.z) < 0.5) area -= s.centre[e].z * (b.x - a.x);
    }
    return area / opening;
}

/// A neutral reacts with probability s_b where ions strike, which is on the floor; walls are
/// covered and give it back.
TrenchCase neutral_limited(double spacing, double s_b) {
    TrenchCase t(80, spacing, mask, 2000);
    t.add_opening("trench", opening);
    t.set_ions(1000, straight_down());
    const int neutral = t.add_neutral("X", 50 * open_rate / s_b);
    auto& film = t.chemistry(0);
    film.density = 50;
    film.coverages = {"X"};
    film.processes = {fluxes::Adsorption{neutral, 0, s_b, 1, {}},
                      fluxes::IonEnhancedEtching{
                          0, 1, {t.add_tally(flat_yield(plenty * 50 * open_rate / 1000))}}};
    return t;
}

/// Time of the law from the mask's foot to an aspect ratio. What is adsorbed on the floor, a share
/// J / (plenty + J) of its sites, lowers the sticking and the rate alike:
/// 1 / J = 1 + s_b (1 - share) (1 / W - 1), d(R0 t / w) = d(AR) / (J (1 - share)).
double law_time(double s_b, double aspect, double faulty_sticking = 0) {
    const double s = faulty_sticking > 0 ? faulty_sticking : s_b;
    const auto slot = [](double l) { // Berman 1965, 0.06 % at l = 5
        const double q = std::sqrt(1 + l * l), log = l - std::log(l + q);
        return 0.5 * (1 + q - l) - 1.5 * log * log / (l * l * l + 3 * l * l + 4 - (l * l + 4) * q);
    };
    const auto slowness = [&](double a) {
        double flux = 1, w = slot(a);
        for (int i = 0; i < 60; ++i)
            flux = 1 / (1 + s * plenty / (plenty + flux) * (1 / w - 1));
        return (plenty + flux) / (plenty * flux);
    };
    double sum = 0;
    const int cells = 400; // Simpson's rule
    const double h = (aspect - first_aspect) / cells;
    for (int i = 0; i < cells; ++i) {
        const double a = first_aspect + i * h;
        sum += h / 6 * (slowness(a) + 4 * slowness(a + 0.5 * h) + slowness(a + h));
    }
    return sum * opening / open_rate;
}

/// Times over those of the law, by aspect ratio, from the first one on.
std::map<double, double> times_over_law(double spacing, double s_b,
                                        const std::vector<double>& aspects) {
    TrenchCase t = neutral_limited(spacing, s_b);
    t.add_step("main", 1e4);
    engine::Simulation simulation(t.c);
    std::map<double, double> ratio;
    double time = 0, aspect = first_aspect;
    for (const double wanted : aspects) {
        double before_time = time, before = aspect;
        while (aspect < wanted) {
            before_time = time, before = aspect;
            simulation.step(1e4);
            time = simulation.time_s();
            aspect = first_aspect + mean_depth(simulation.surface()) / opening;
        }
        const double at =
            before_time + (wanted - before) / (aspect - before) * (time - before_time);
        ratio[wanted] = at / law_time(s_b, wanted);
        WARN("s_b " << s_b << " AR " << wanted << " spacing " << spacing << ": time over the law "
                    << ratio[wanted]);
    }
    return ratio;
}

} // namespace

TEST_CASE("the law with adsorbed atoms is the tabulated one where ions are plenty",
          "[validation][depth_time]") {
    // Oracle: arde_depth_time.csv.
    // Source: computed (transmission of slots).
    // Tolerance: adsorbed atoms cost 1 / plenty of the time at AR 0 and less further down: times
    // between the table's and 1 / plenty more; half the sticking must fail.
    const auto law = read_keyed_table<1>("arde_depth_time.csv");
    for (const auto& [s_b, column] :
         {std::pair(0.1, "tau_tr_sb0.1"), {0.5, "tau_tr_sb0.5"}, {1.0, "tau_tr_sb1"}})
        for (const double aspect : {1.0, 2.0, 5.0}) {
            const double table = (law.at({aspect}).at(column) - law.at({first_aspect}).at(column)) *
                                 opening / open_rate;
            CHECK(law_time(s_b, aspect) > 0.999 * table);
            CHECK(law_time(s_b, aspect) < (1.001 + 1 / plenty) * table);
            if (s_b == 1) CHECK_FALSE(law_time(s_b, aspect, 0.5) > 0.999 * table);
        }
}

TEST_CASE("neutral-limited trench follows the depth-time law", "[validation][depth_time]") {
    // Oracle: R0 t / w = AR + s_b G(AR), corrected for adsorbed atoms, from AR 0.25 (the mask) on;
    // depth is the etched area over the width. A free floor bows, which the law leaves out: at
    // s_b = 1 the time is 0.984 of it at AR 1.
    // Source: derived here; the factors of free floors computed with a front-tracking prototype.
    // Tolerance: 1.2 % at s_b 0.1 and 0.5, 0.5 % of the law times its factor at 1; the law of
    // another s_b must fail. At s_b 0.1, 0.5 % is wanted: the front widens the trench below the
    // mask by a quarter of a cell a side, which makes 1 % of the area at 40 cells across.
    const auto slow = times_over_law(1, 0.1, {1});
    const auto middle = times_over_law(1, 0.5, {1});
    const auto fast = times_over_law(1, 1, {1});
    CAPTURE(slow.at(1), middle.at(1), fast.at(1));
    CHECK(std::fabs(slow.at(1) - 1) < 1.2e-2);
    CHECK(std::fabs(middle.at(1) - 1) < 1.2e-2);
    CHECK(std::fabs(fast.at(1) / 0.984 - 1) < 5e-3);
    CHECK_FALSE(std::fabs(fast.at(1) - 1) < 5e-3);
    CHECK_FALSE(std::fabs(fast.at(1) * law_time(1, 1) / law_time(0.5, 1) - 1) < 1.2e-2);
}

TEST_CASE("neutral-limited deep trench follows the depth-time law",
          "[validation][depth_time][long]") {
    // Oracle, source, tolerance: as above, at AR 2 and 5, with the factors 0.985 and 0.989 at
    // s_b = 1.
    const auto slow = times_over_law(1, 0.1, {2, 5});
    const auto middle = times_over_law(1, 0.5, {2, 5});
    const auto fast = times_over_law(1, 1, {2, 5});
    for (const double aspect : {2.0, 5.0}) {
        CAPTURE(aspect, slow.at(aspect), middle.at(aspect), fast.at(aspect));
        CHECK(std::fabs(slow.at(aspect) - 1) < 1.2e-2);
        CHECK(std::fabs(middle.at(aspect) - 1) < 1.2e-2);
        CHECK(std::fabs(fast.at(aspect) / (aspect == 2 ? 0.985 : 0.989) - 1) < 5e-3);
    }
}
