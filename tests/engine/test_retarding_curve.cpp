// SPDX-License-Identifier: Apache-2.0
#include "engine/retarding_curve_file.hpp"

#include <catch2/catch.hpp>
#include <fmt/format.h>

#include <cmath>

using namespace rille::engine;

namespace {

/// Collector current of ions with two Gaussian peaks, plus a wave for noise.
std::string curve(double noise, double step = 1) {
    std::string text = "voltage_V,current_A\n";
    for (double v = 0; v <= 200 + 1e-9; v += step) {
        const double passed = 0.5 * 0.5 * std::erfc((v - 80) / (6 * std::sqrt(2.0))) +
                              0.5 * 0.5 * std::erfc((v - 130) / (6 * std::sqrt(2.0)));
        text += fmt::format("{},{:.12g}\n", v, 1e-6 * (passed + noise * std::sin(2.9 * v)));
    }
    return text;
}

double moment(const RetardingSpectrum& s, int power, double centre) {
    double sum = 0;
    for (std::size_t b = 0; b < s.share.size(); ++b)
        sum += s.share[b] *
               std::pow(0.5 * (s.energy_edges_ev[b] + s.energy_edges_ev[b + 1]) - centre, power);
    return sum;
}

} // namespace

// Oracle: current of two Gaussian peaks of energy, 80 and 130 eV, sigma 6 eV: mean 105 eV, standard
// deviation sqrt(25^2 + 6^2) = 25.71 eV. Source: derived here (-dI/dV is the flux per energy).
// Tolerance: mean 0.2 eV; the parabola of half width 4 V widens a peak by less than 2 %.
TEST_CASE("a retarding curve gives back the energies behind it", "[retarding]") {
    Problems problems;
    const auto spectrum = parse_retarding_curve(curve(0), "a.csv", 4, 0, problems);
    REQUIRE(spectrum);
    CHECK(problems.empty());
    CHECK(moment(*spectrum, 1, 0) == Approx(105).margin(0.2));
    CHECK(std::sqrt(moment(*spectrum, 2, 105)) == Approx(25.71).epsilon(0.02));
    CHECK(spectrum->dropped < 1e-3);
    CHECK(spectrum->warnings.empty());

    SECTION("seen from ground, all energies shift by the wafer's potential") {
        const auto shifted = parse_retarding_curve(curve(0), "a.csv", 4, 250, problems);
        REQUIRE(shifted);
        CHECK(moment(*shifted, 1, 0) == Approx(355).margin(0.2));
    }
    SECTION("noise makes negative slopes, which are set to 0 and reported") {
        const auto noisy = parse_retarding_curve(curve(0.004), "a.csv", 1.5, 0, problems);
        REQUIRE(noisy);
        CHECK(noisy->dropped > 0.01);
        REQUIRE(noisy->warnings.size() == 1);
        CHECK(noisy->warnings[0].find("negative") != std::string::npos);
        const auto smooth = parse_retarding_curve(curve(0.004), "a.csv", 8, 0, problems);
        REQUIRE(smooth);
        CHECK(smooth->dropped < 0.3 * noisy->dropped);
    }
}

TEST_CASE("retarding curves that cannot be are refused at their place", "[retarding]") {
    const auto report = [](const std::string& text) {
        Problems problems;
        CHECK_FALSE(parse_retarding_curve(text, "a.csv", 4, 0, problems));
        REQUIRE(problems.size() >= 1);
        return describe(problems.sorted()[0]);
    };
    std::string back = curve(0, 20);
    back.replace(back.find("\n60,"), 4, "\n10,");
    CHECK(report(back) == "a.csv:5:1: \"10\" does not exceed the voltage 40 before it");
    CHECK(report("voltage_V,current_A\n0,1\n1,0.5\n") ==
          "a.csv: holds 2 points; at least 8 are due");
    CHECK(report("U,I\n0,1\n").find("a.csv:1:1: \"U\" stands where the columns") == 0);
    std::string nan = curve(0, 20);
    nan.replace(nan.find("\n60,"), 4, "\nnan,");
    CHECK(report(nan).find("a.csv:5:1: \"nan\" is not a finite number") == 0);
    std::string rising = "voltage_V,current_A\n";
    for (int v = 0; v < 20; ++v)
        rising += fmt::format("{},{}\n", v, v);
    CHECK(report(rising).find("the current does not fall") != std::string::npos);
}
