// SPDX-License-Identifier: Apache-2.0
#include "fluxes/ion_import.hpp"

#include <catch2/catch.hpp>

#include <cmath>
#include <stdexcept>

using namespace rille::fluxes;

namespace {

constexpr double degree = 3.14159265358979323846 / 180;

/// Cosine law times a flat energy distribution, as cells of the given kind.
std::vector<std::vector<double>> cosine_cells(const std::vector<double>& energy,
                                              const std::vector<double>& angle,
                                              IonTableQuantity quantity, double scale) {
    std::vector<std::vector<double>> cell;
    for (std::size_t e = 0; e + 1 < energy.size(); ++e) {
        cell.emplace_back();
        for (std::size_t a = 0; a + 1 < angle.size(); ++a) {
            const double from = angle[a] * degree, to = angle[a + 1] * degree;
            const double width = energy[e + 1] - energy[e];
            double value = (std::pow(std::sin(to), 2) - std::pow(std::sin(from), 2)) * width;
            if (quantity == IonTableQuantity::per_ev_per_sr)
                value /= width * 2 * 180 * degree * (std::cos(from) - std::cos(to));
            if (quantity == IonTableQuantity::per_ev_per_deg)
                value /= width * (angle[a + 1] - angle[a]);
            cell.back().push_back(scale * value);
        }
    }
    return cell;
}

} // namespace

TEST_CASE("imported ion tables", "[ions]") {
    // Oracle: cosine law written as cells of each kind: F = sin^2, mean energy, share beyond 60 deg =
    //         0.25, factor = 1 / (scale * total).
    // Source: definition of the three kinds of cell.
    // Tolerance: 1e-12; a table read as the wrong kind must be off by more than 1 %.
    std::vector<double> energy = {10, 15, 30, 60, 64}, angle;
    for (int a = 0; a <= 18; ++a) angle.push_back(5 * a);
    for (auto quantity : {IonTableQuantity::per_bin, IonTableQuantity::per_ev_per_sr,
                          IonTableQuantity::per_ev_per_deg}) {
        const auto read = import_ions(energy, angle, cosine_cells(energy, angle, quantity, 3), quantity);
        for (double th : {5.0, 30.0, 45.0, 60.0})
            CHECK(read.distribution.share_within_deg(th) == Approx(std::pow(std::sin(th * degree), 2)).epsilon(1e-12));
        CHECK(read.distribution.mean_energy_ev() == Approx(37).epsilon(1e-12));
        CHECK(read.beyond_60_share == Approx(0.25).epsilon(1e-12));
        CHECK(read.last_energy_share == Approx(4.0 / 54).epsilon(1e-12));
        CHECK(read.last_angle_share == Approx(std::pow(std::cos(85 * degree), 2)).epsilon(1e-9));
        CHECK(read.factor == Approx(1 / (3 * 54.0)).epsilon(1e-12));
    }
    const auto wrong = import_ions(energy, angle,
                                   cosine_cells(energy, angle, IonTableQuantity::per_ev_per_sr, 1),
                                   IonTableQuantity::per_ev_per_deg);
    CHECK(wrong.distribution.share_within_deg(45) != Approx(0.5).epsilon(0.01));
    CHECK_THROWS_AS(import_ions({1, 1}, {0, 90}, {{1}}, IonTableQuantity::per_bin), std::invalid_argument);
    CHECK_THROWS_AS(import_ions({1, 2}, {0, 90}, {{1}, {1}}, IonTableQuantity::per_bin), std::invalid_argument);
    CHECK_THROWS_AS(import_ions({1, 2}, {0, 90}, {{NAN}}, IonTableQuantity::per_bin), std::invalid_argument);
}
