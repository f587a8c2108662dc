// SPDX-License-Identifier: Apache-2.0
// Tables of what ions do on tilted surfaces against the plain sum over every ion of the quadrature.
#include "fluxes/cross_sections.hpp"
#include "fluxes/gathered_ions.hpp"
#include "fluxes/ion_tables.hpp"
#include "fluxes/sheath_trajectories.hpp"
#include "tests/support/sheath_cases.hpp"

#include <catch2/catch.hpp>

#include <cmath>
#include <vector>

using namespace rille::fluxes;
using namespace rille::tests;

namespace {

/// Every node of the quadrature with one yield, summed without any merging.
class PlainSum {
public:
    PlainSum(const InPlane& plane, const YieldFunction& yield) : plane_(plane), yield_(yield) {
        std::vector<double> energy;
        for (const auto& spectrum : plane.spectra) {
            energy.push_back(0);
            for (const auto& e : spectrum)
                energy.back() += yield.scale * e.share * energy_yield(yield.energy, e.energy_ev);
        }
        for (const InPlane::Node& node : plane.nodes)
            weight_.push_back(node.weight * energy[node.spectrum]);
    }
    /// Running sum at the edges of the bins on a surface that leans by `psi`.
    std::vector<double> at_edges(double psi) const {
        std::vector<double> sum(plane_.angle.size(), 0.0);
        for (std::size_t n = 0; n < weight_.size(); ++n) {
            const InPlane::Node& node = plane_.nodes[n];
            const double received = std::cos(psi) + node.slope * std::sin(psi);
            if (received > 0)
                sum[node.bin + 1] +=
                    weight_[n] * received * angle_factor(yield_.angle, received * node.cos_polar);
        }
        for (std::size_t b = 1; b < sum.size(); ++b)
            sum[b] += sum[b - 1];
        return sum;
    }

private:
    const InPlane& plane_;
    YieldFunction yield_;
    std::vector<double> weight_;
};

/// Largest distance between table and plain sum at some angles of the surface and all edges in the
/// plane, over what the surface receives from all ions or, out of the beam, 1 % of the floor's.
/// The plain sum may be of another yield.
double farthest(const IonDistribution& ions, const YieldFunction& yield,
                const YieldFunction& other) {
    const IonTables tables(rille::geometry::Symmetry::extruded, {{"X+", 40, 1, ions}},
                           {{0, yield}});
    const PlainSum plain(tables.in_plane(0), other);
    const double floor = plain.at_edges(0).back();
    double worst = 0;
    for (std::size_t k = 0; k < tables.angles().size(); k += 19) {
        const std::vector<double> sums = plain.at_edges(tables.angles()[k]);
        for (std::size_t b = 1; b < sums.size(); ++b) {
            std::vector<double> row(tables.angles().size(), 0.0);
            tables.add(0, {static_cast<int>(b) - 1, 1}, 1, 0, row.size(), row.data());
            worst =
                std::max(worst, std::fabs(row[k] - sums[b]) / std::max(sums.back(), 0.01 * floor));
        }
    }
    return worst;
}
double farthest(const IonDistribution& ions, const YieldFunction& yield) {
    return farthest(ions, yield, yield);
}

IonDistribution followed(double mtorr, bool fast_neutrals) {
    SheathIon ion = argon_ion(0.1);
    ion.collisions = argon_in_argon(gas_density(mtorr));
    const Arrivals r = follow_ions(swinging_sheath(4 / 3., 0.8, 5, 39.948), ion, {20000, 1});
    return distribution_of(fast_neutrals ? r.fast_neutrals : r.ions);
}

IonDistribution energies_only() {
    std::vector<double> edges, weight;
    for (int e = 0; e <= 40; ++e)
        edges.push_back(5 + 5 * e);
    for (int e = 0; e < 40; ++e)
        weight.push_back(1 + std::sin(0.3 * e));
    return IonDistribution::falling_spectrum(edges, weight, 0.3);
}

} // namespace

TEST_CASE("tables of ions are the plain sums", "[ions][tables]") {
    // Oracle: the sum over every node of the quadrature in the plane, one angular factor each.
    // Source: definition of the tables. Tolerance: 1e-4 of what a surface of that angle receives
    // (of 1 % of the floor's where it is out of the beam).
    const EnergyLaw energy = SquareRootLaw{1, 20};
    const YieldFunction yields[] = {
        {energy, FlatAngle{}, 1},          {energy, PlateauCosine{45}, 1},
        {energy, PlateauLinear{78}, 2},    {energy, PlateauLinear{0}, 1},
        {energy, YamamuraAngle{2, 65}, 1}, {energy, YamamuraAngle{5, 75}, 1}};
    const IonDistribution beam = followed(5, false), collided = followed(100, false),
                          neutrals = followed(100, true);
    const IonDistribution mixed = IonDistribution::mixture({1, 0.5}, {collided, neutrals});
    const IonDistribution all[] = {beam,
                                   collided,
                                   neutrals,
                                   mixed,
                                   energies_only(),
                                   IonDistribution::thermal_fall(0, 30, 30),
                                   IonDistribution::thermal_fall(100, 0.5, 0.5),
                                   IonDistribution::beam(300, {0.1, 0, -1})};
    for (std::size_t d = 0; d < std::size(all); ++d)
        for (std::size_t y = 0; y < std::size(yields); ++y) {
            CAPTURE(d, y);
            CHECK(farthest(all[d], yields[y]) < 1e-4);
        }
    // A peak of the angular factor 0.1 deg away is seen.
    CHECK(farthest(collided, {energy, YamamuraAngle{2, 65}, 1},
                   {energy, YamamuraAngle{2, 65.1}, 1}) > 1e-4);
}

TEST_CASE("a mixture of ions does what its parts do", "[ions][tables]") {
    // Oracle: what a tilted surface receives from a mixture is the sum over its parts; the many
    // light nodes that a mixture joins must not show. Source: definition. Tolerance: 3e-4 of what
    // the surface receives (of 1 % of the floor's where it is out of the beam); a share of a part
    // 1 % off must fail.
    const IonDistribution ions = followed(50, false), neutrals = followed(50, true),
                          free = energies_only();
    const IonDistribution mixed = IonDistribution::mixture({0.7, 0.1, 0.2}, {free, ions, neutrals});
    CHECK(mixed.in_plane().nodes.size() < 50000);
    for (const AngleLaw& angle :
         {AngleLaw(FlatAngle{}), AngleLaw(PlateauLinear{78}), AngleLaw(YamamuraAngle{2, 65})}) {
        const YieldFunction yield{SquareRootLaw{1, 20}, angle, 1};
        const PlainSum whole(mixed.in_plane(), yield), first(free.in_plane(), yield),
            second(ions.in_plane(), yield), third(neutrals.in_plane(), yield);
        const double floor = whole.at_edges(0).back();
        const auto worst = [&](double share) {
            double off = 0;
            for (double psi = 0; psi < 2; psi += 0.05) {
                const double parts = 0.7 * first.at_edges(psi).back() +
                                     0.1 * second.at_edges(psi).back() +
                                     share * third.at_edges(psi).back();
                off = std::max(off, std::fabs(whole.at_edges(psi).back() - parts) /
                                        std::max(parts, 0.01 * floor));
            }
            return off;
        };
        CHECK(worst(0.2) < 3e-4);
        CHECK(worst(0.198) > 3e-4);
    }
}
