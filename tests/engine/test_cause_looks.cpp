// SPDX-License-Identifier: Apache-2.0
// How causes are shown.
#include "engine/cause_bands.hpp"
#include "engine/causes.hpp"
#include "engine/palette.hpp"

#include <catch2/catch.hpp>

#include <cmath>

using namespace rille;
using namespace rille::engine;

TEST_CASE("causes: bands keep their distance in lightness", "[causes]") {
    // Oracle: neighbours in a stack differ by at least 15 in lightness or are hatched apart.
    // Source: common practice, no source. Tolerance: none.
    const auto& looks = cause_looks();
    for (std::size_t k = 0; k + 1 < looks.size(); ++k) {
        INFO(looks[k].column);
        CHECK((std::fabs(lightness(looks[k].colour) - lightness(looks[k + 1].colour)) > 15 ||
               looks[k].hatched != looks[k + 1].hatched));
    }
}

TEST_CASE("causes: axes have round ticks", "[causes]") {
    const AxisScale plain{-1.5, 12, false};
    CHECK(plain.ticks(4) == std::vector<double>{0, 5, 10});
    CHECK(plain.part(12) == Approx(1));
    const AxisScale decades{1e-3, 2, true};
    CHECK(decades.ticks(4).size() == 4);
    CHECK(decades.part(1e-9) == Approx(0));
}
