// SPDX-License-Identifier: Apache-2.0
#include "engine/ion_table_file.hpp"

#include <catch2/catch.hpp>

#include <cmath>

using namespace rille::engine;

namespace {

const std::string bins = "# quantity=flux_fraction_per_bin\n# source=invented\n";
const std::string matrix = "# quantity=per_eV_per_sr\n# source=invented\n";

IonTable table_of(const std::string& text) {
    Problems problems;
    const auto table = parse_ion_table(text, "t.csv", problems);
    INFO((problems.empty() ? "" : describe(problems.sorted()[0])));
    REQUIRE(table.has_value());
    return *table;
}

std::string report_of(const std::string& text) {
    Problems problems;
    CHECK_FALSE(parse_ion_table(text, "t.csv", problems).has_value());
    std::string report;
    for (const Problem& problem : problems.sorted())
        report += (report.empty() ? "" : "\n") + describe(problem);
    return report;
}

} // namespace

TEST_CASE("energy bins are read, gaps hold nothing, and the sum becomes 1") {
    const IonTable table =
        table_of(bins + "E_lo_eV,E_hi_eV,weight\n90,100,1\n100,110,2\n120,130,1\n");
    CHECK(table.energy_edges_ev == std::vector<double>{90, 100, 110, 120, 130});
    REQUIRE(table.weight.size() == 4);
    CHECK(table.weight[1][0] == 0.5);
    CHECK(table.weight[2][0] == 0);
    CHECK(table.sum == 4);
    REQUIRE(table.warnings.size() == 2); // divided by 4; a quarter in the last bin
    CHECK(table.warnings[1] == "t.csv: 25 % of the ions sit in the last energy bin; is the table "
                               "cut off?");
}

// Oracle: an arcsine energy distribution, 1/(pi sqrt((E - a)(b - E))), mean (a + b)/2 and variance
// (b - a)^2/8, written as shares per bin and read back.
// Source: derived here.
// Tolerance: 0.1 bin for the mean and the root of the variance.
TEST_CASE("an arcsine distribution keeps its moments") {
    const double a = 50, b = 150, pi = std::acos(-1.0);
    const int count = 50;
    const double step = (b - a) / count;
    const auto below = [&](double e) {
        return 0.5 + std::asin(std::min(1.0, std::max(-1.0, (2 * e - a - b) / (b - a)))) / pi;
    };
    std::string text = bins;
    for (int i = 0; i < count; ++i) {
        const double low = a + i * step;
        text += std::to_string(low) + "," + std::to_string(low + step) + "," +
                std::to_string(below(low + step) - below(low)) + "\n";
    }
    const IonTable table = table_of(text);
    double mean = 0, square = 0;
    for (int i = 0; i < count; ++i) {
        const double middle = 0.5 * (table.energy_edges_ev[i] + table.energy_edges_ev[i + 1]);
        mean += middle * table.weight[i][0];
        square += middle * middle * table.weight[i][0];
    }
    const double sigma = std::sqrt(square - mean * mean);
    CHECK(std::abs(mean - 100) < 0.1 * step);
    CHECK(std::abs(sigma - (b - a) / std::sqrt(8.0)) < 0.1 * step);
    CHECK(std::abs(mean - 100.5) > 0.1 * step); // a shift of a quarter bin would be seen
    CHECK(distribution_of(table, 0.2).mean_energy_ev() == Approx(100).margin(0.1 * step));
}

TEST_CASE("points become trapezoids") {
    const IonTable table =
        table_of("# quantity=flux_per_eV\n# source=x\nE_eV,value\n0,0\n10,2\n20,0\n");
    REQUIRE(table.weight.size() == 2);
    CHECK(table.weight[0][0] == Approx(0.5));
    CHECK(table.sum == Approx(20));
}

// Oracle: per steradian times 2 pi (cos th1 - cos th2) dE; per degree times dth dE.
// Source: definitions.
// Tolerance: round-off.
TEST_CASE("densities per angle are integrated over the bins") {
    const IonTable table = table_of(matrix + "E\\theta,0,1,2\n100,1,1\n110,1,1\n130\n");
    const double pi = std::acos(-1.0);
    const double inner = 1 - std::cos(pi / 180), outer = std::cos(pi / 180) - std::cos(pi / 90);
    CHECK(table.angle_edges_deg == std::vector<double>{0, 1, 2});
    CHECK(table.weight[0][0] / table.weight[0][1] == Approx(inner / outer).epsilon(1e-12));
    CHECK(table.weight[1][0] / table.weight[0][0] == Approx(2).epsilon(1e-12));
    const IonTable flat =
        table_of("# quantity=per_eV_per_deg\n# source=x\n,0,1,3\n100,1,1\n110,1,1\n130\n");
    CHECK(flat.weight[0][1] / flat.weight[0][0] == Approx(2).epsilon(1e-12));
}

TEST_CASE("every fault of a table has its place") {
    CHECK(report_of("1,2,3\n") ==
          "t.csv: quantity: the header line # quantity=... is missing; one of "
          "flux_fraction_per_bin, flux_per_eV, per_bin, per_eV_per_sr or per_eV_per_deg is due");
    CHECK(report_of(bins + "90,100,1\n95,110,1\n") ==
          "t.csv:4:1: \"95\" lies below the upper edge 100 of the bin before");
    CHECK(report_of(bins + "90,100,-1\n100, nan,1\n") ==
          "t.csv:3:8: \"-1\" is negative\nt.csv:4:6: \"nan\" is not a finite number");
    CHECK(report_of(bins + "90,100\n") ==
          "t.csv:3:1: 2 values in a row of 3 (E_lo_eV, E_hi_eV or weight)");
    CHECK(report_of(bins + "90,100,0\n") == "t.csv: the values must add up to more than 0");
    CHECK(report_of(bins) == "t.csv: the table holds no bins");
    CHECK(report_of(matrix + ",0,2,1\n100,1,1\n110\n") ==
          "t.csv:3:6: \"1\" does not exceed the edge 2 before it");
    CHECK(report_of(matrix + ",0,1,2\n100,1\n110\n") ==
          "t.csv:4:1: 2 values in a row of 3 (energy edge and one for each angle bin)");
    CHECK(
        report_of("# quantity=per_bin\n# angle_convention=projected\n,0,1,2\n1,1,1\n2\n") ==
        "t.csv:2:1: angle_convention: \"projected\": angles must be polar angles from the surface "
        "normal (polar); projected angles are another distribution");
    CHECK(report_of("# quantty=per_bin\n") ==
          "t.csv: quantity: the header line # quantity=... is missing; one of "
          "flux_fraction_per_bin, flux_per_eV, per_bin, per_eV_per_sr or per_eV_per_deg is due\n"
          "t.csv:1:1: quantty: unknown header key; allowed: quantity, species, mass_amu, charge, "
          "total_flux_m2s, angle_convention, energy_reference or source; did you mean "
          "\"quantity\"?");
}

// Oracle: median polar angle asin sqrt(-T/E ln(1 - (1 - exp(-E/T))/2)) of a thermal spread.
// Source: derived here from exponential transverse energies.
// Tolerance: 1 % (bins in angle).
TEST_CASE("a table of energy alone gets thermal angles") {
    const IonTable table = table_of(bins + "99.5,100.5,1\n");
    const double pi = std::acos(-1.0), spread = 0.2, energy = 100;
    const double median = std::asin(std::sqrt(spread / energy * std::log(2.0))) * 180 / pi;
    CHECK(distribution_of(table, spread).median_angle_deg() == Approx(median).epsilon(0.01));
    CHECK_FALSE(distribution_of(table, 1.05 * spread).median_angle_deg() ==
                Approx(median).epsilon(0.01));
}
