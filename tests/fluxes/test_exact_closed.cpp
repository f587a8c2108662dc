// SPDX-License-Identifier: Apache-2.0
#include "fluxes/exact_exchange.hpp"
#include "tests/support/closed_table.hpp"
#include "tests/support/shapes.hpp"

#include <catch2/catch.hpp>

#include <algorithm>
#include <cmath>
#include <map>
#include <string>

using namespace rille;
using fluxes::ExactExchange;
using geometry::Domain;
using geometry::Surface;

namespace {

constexpr double width = 20;

/// A closed trench with `across` elements over the floor, and its exchange.
struct Trench {
    Domain domain;
    Surface surface;
    double depth;
    std::unique_ptr<ExactExchange> exchange;

    Trench(double aspect, int across, const fluxes::PatchSizes& sizes = {})
        : depth(aspect * width) {
        domain.cells_x = 30;
        surface = tests::trench(domain, width, depth, width / across);
        const geometry::RayCaster caster(domain, surface, 1.0);
        exchange =
            std::make_unique<ExactExchange>(domain, surface, caster, std::vector<int>{}, sizes);
    }
    bool on_floor(int e) const { return surface.centre[e].z < -depth + 1e-6; }
    bool on_wall(int e) const { return surface.centre[e].z < -1e-6 && !on_floor(e); }

    std::vector<double> flux(double s_wall, double s_floor) const {
        std::vector<double> sticking(surface.size(), 0);
        for (int e = 0; e < int(sticking.size()); ++e)
            sticking[e] = on_floor(e) ? s_floor : on_wall(e) ? s_wall : 0;
        return exchange->solve(sticking);
    }
    double floor(const std::vector<double>& flux) const {
        double sum = 0;
        for (int e = 0; e < int(flux.size()); ++e)
            if (on_floor(e)) sum += surface.area[e] * flux[e] / width;
        return sum;
    }
};

/// Places to compare, by the column of the table.
std::map<std::string, double> summary(const Trench& t, const std::vector<double>& flux) {
    std::map<std::string, double> out{{"bottom_avg", t.floor(flux)}};
    std::vector<std::array<double, 2>> wall, floor; // place, flux
    double mean = 0;
    for (int e = 0; e < int(flux.size()); ++e) {
        const auto& c = t.surface.centre[e];
        if (t.on_wall(e)) mean += 0.5 * t.surface.area[e] * flux[e] / t.depth;
        if (t.on_wall(e) && c.x < 0) wall.push_back({-c.z / t.depth, flux[e]});
        if (t.on_floor(e)) floor.push_back({c.x, flux[e]});
    }
    out["H_wall_mean"] = mean;
    const auto at = [](const std::vector<std::array<double, 2>>& v, double place) {
        std::size_t i = 1;
        while (i + 1 < v.size() && v[i][0] < place)
            ++i;
        const double t = (place - v[i - 1][0]) / (v[i][0] - v[i - 1][0]);
        return v[i - 1][1] + t * (v[i][1] - v[i - 1][1]);
    };
    // In the middle of an even number: a parabola through two on either side.
    const std::size_t m = floor.size() / 2;
    out["bottom_centre"] =
        (9 * (floor[m - 1][1] + floor[m][1]) - floor[m - 2][1] - floor[m + 1][1]) / 16;
    for (const char* name :
         {"0.00", "0.05", "0.10", "0.25", "0.50", "0.75", "0.90", "0.95", "0.99"})
        out[std::string("H_") + name] = at(wall, std::stod(name));
    return out;
}

/// Largest relative deviations over the rows of one aspect ratio, by what is compared.
std::map<std::string, double> deviations(double aspect, double fault = 1) {
    const auto table = tests::read_keyed_table<3>("closed_trench.csv");
    const Trench trench(aspect, 20);
    std::map<std::string, double> worst;
    for (const auto& [key, row] : table) {
        if (key[0] != aspect) continue;
        for (const auto& [name, value] : summary(trench, trench.flux(key[1], key[2]))) {
            // Next to the corner the flux varies on every scale.
            if (name == "H_0.99" && 0.01 * trench.depth <= width / 20) continue;
            double& w =
                worst[name == "bottom_avg" || name == "H_0.00" || name == "bottom_centre" ? name
                                                                                          : "wall"];
            w = std::max(w, std::fabs(fault * value / row.at(name) - 1));
        }
    }
    return worst;
}

} // namespace

TEST_CASE("exact exchange: closed trench", "[exact]") {
    // Oracle: impinging flux on floor and walls of a closed trench, every row of
    // closed_trench.csv.
    // Source: computed (integral equation, 1e-8).
    // Tolerance: 20 elements across (17 patches): floor average 0.05 %, floor centre and wall
    // 0.3 %, mouth by extrapolation 1 %; values 0.1 % off must fail.
    const auto close = [](const std::map<std::string, double>& w) {
        return w.at("bottom_avg") < 5e-4 && w.at("bottom_centre") < 3e-3 && w.at("wall") < 3e-3 &&
               w.at("H_0.00") < 1e-2;
    };
    for (const double aspect : {1, 2, 5, 10, 20, 40, 60, 100}) {
        const auto worst = deviations(aspect);
        CAPTURE(aspect, worst.at("bottom_avg"), worst.at("bottom_centre"), worst.at("wall"),
                worst.at("H_0.00"));
        CHECK(close(worst));
        if (aspect < 20) CHECK_FALSE(close(deviations(aspect, 1.001)));
    }
}

TEST_CASE("exact exchange: transmission of slots", "[exact]") {
    // Oracle: transmission of a slot = flux on an absorbing floor below inert walls.
    // Source: computed (integral equation, 1e-9), clausing_slot.csv.
    // Tolerance: 0.1 %; values 0.2 % off must fail.
    const auto worst = [](double fault) {
        double largest = 0;
        for (const auto& [key, row] : tests::read_keyed_table<1>("clausing_slot.csv")) {
            if (key[0] < 0.5 || key[0] > 100) continue;
            const Trench trench(key[0], 20);
            const double w = fault * trench.floor(trench.flux(0, 1));
            largest = std::max(largest, std::fabs(w / row.at("W_exact") - 1));
        }
        return largest;
    };
    const double right = worst(1);
    CAPTURE(right);
    CHECK(right < 1e-3);
    CHECK_FALSE(worst(1.002) < 1e-3);
}

TEST_CASE("exact exchange: order in the size of patches", "[exact]") {
    // Oracle: floor flux of closed_trench.csv.
    // Source: computed (integral equation, 1e-8).
    // Tolerance: order >= 1.8 between 5 and 20 elements across, patches being elements; a first
    // order error of the same size must fail.
    const auto table = tests::read_keyed_table<3>("closed_trench.csv");
    const fluxes::PatchSizes elements{0, 0, 1e9};
    for (const auto& s : {std::array<double, 2>{0, 1}, {0.01, 0.1}, {0.1, 0.5}}) {
        const double exact = table.at({5, s[0], s[1]}).at("bottom_avg");
        const auto error = [&](int across) {
            const Trench t(5, across, elements);
            return std::fabs(t.floor(t.flux(s[0], s[1])) - exact);
        };
        const double order = std::log(error(5) / error(20)) / std::log(4.0);
        CAPTURE(s[0], s[1], order);
        CHECK(order > 1.8);
    }
}
