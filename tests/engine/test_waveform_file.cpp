// SPDX-License-Identifier: Apache-2.0
#include "engine/waveform_file.hpp"

#include <catch2/catch.hpp>
#include <fmt/format.h>

#include <cmath>

using namespace rille::engine;

namespace {

std::string sine(double last) {
    std::string text = "time_us,voltage_V\n";
    for (int i = 0; i <= 400; ++i)
        text += fmt::format("{:.12g},{:.12g}\n", 0.5 * i / 400,
                            i == 400 ? last : 120 * std::sin(2 * 3.14159265358979323846 * i / 400));
    return text;
}

std::string report(const std::string& text) {
    Problems problems;
    CHECK_FALSE(parse_waveform(text, "w.csv", problems));
    REQUIRE(problems.size() >= 1);
    return describe(problems.sorted()[0]);
}

} // namespace

// Oracle: the sine that was written. Source: derived here.
// Tolerance: 1e-4 of the amplitude, the error of 400 straight pieces.
TEST_CASE("a sampled waveform is read as it was written", "[waveform]") {
    Problems problems;
    const auto wave = parse_waveform(sine(0), "w.csv", problems);
    REQUIRE(wave);
    CHECK(wave->period_s == Approx(0.5e-6));
    CHECK(wave->mean() == Approx(0).margin(1e-9));
    for (const double t : {0.03e-6, 0.2e-6, 0.49e-6})
        CHECK(wave->at(t) ==
              Approx(120 * std::sin(2 * 3.14159265358979323846 * t / 0.5e-6)).margin(0.012));
}

TEST_CASE("waveforms that cannot be are refused at their place", "[waveform]") {
    CHECK(report(sine(7)).find("w.csv:402:5: the period ends at 7 V and starts at 0 V") == 0);
    CHECK(report("time_us,voltage_V\n0,0\n2,5\n1,3\n3,0\n") ==
          "w.csv:4:1: \"1\" does not exceed the time 2 before it");
    CHECK(report("time_us,voltage_V\n0,3\n1,3\n2,3\n") == "w.csv:2:3: the voltage never changes");
    CHECK(report("time_us,voltage_V\n0,3\n").find("holds 1 points") != std::string::npos);
}
