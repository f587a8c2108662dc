// SPDX-License-Identifier: Apache-2.0
// Ions through a sheath: the closed form against trajectories, in one process on one thread, with
// the times of both beside the ratio.
#include "timing.hpp"

#include "engine/content_cache.hpp"
#include "engine/packed_trajectories.hpp"
#include "fluxes/cross_sections.hpp"
#include "fluxes/plasma_laws.hpp"
#include "fluxes/sheath_arrival.hpp"
#include "fluxes/sheath_trajectories.hpp"

#include <cmath>
#include <filesystem>
#include <iostream>
#include <nlohmann/json.hpp>
#include <tbb/global_control.h>

using namespace rille;
using namespace rille::fluxes;

namespace {

/// Time [s] to take binned trajectories from the cache and make the distribution of them.
double cached_read(const Sheath& sheath, const SheathIon& ion, const TrajectorySampling& sampling) {
    const std::string folder =
        (std::filesystem::temp_directory_path() / "rille_bench_cache").string();
    const engine::ContentCache cache(folder);
    const std::vector<double> content = content_of(sheath, ion, sampling);
    cache.keep(content, engine::packed(follow_into_bins(sheath, ion, sampling)));
    std::vector<double> times;
    for (int n = 0; n < 9; ++n)
        times.push_back(bench::thread_seconds([&] {
            const auto kept = engine::unpacked(*cache.find(content));
            if (!(arrival_of(*kept).ions.front().mean_energy_ev() > 0)) std::abort();
        }));
    std::filesystem::remove_all(folder);
    return bench::median(times);
}

} // namespace

int main() {
    const tbb::global_control one(tbb::global_control::max_allowed_parallelism, 1);
    constexpr double edge_density = 6.065e-11; // argon of 1e11 /cm3 [nm^-3]
    const Waveform voltage = Waveform::sum_of({{13.56e6, 150, 0}}).raised_by(200);
    const Sheath sheath = make_sheath(3, edge_density, voltage, HUGE_VAL).sheath;
    SheathIon argon;
    argon.name = "Ar+";
    argon.mass_amu = 39.948;
    argon.collisions = argon_in_argon(gas_density(0.6, 300)); // 4.5 mTorr: half the limit of (a)
    const TrajectorySampling sampling{100000, 1};
    double mean_a = 0, mean_b = 0;
    const bench::Comparison c = bench::compare(
        5, [&] { mean_a = arrive_in_closed_form(sheath, argon).ions.front().mean_energy_ev(); },
        [&] {
            mean_b = distribution_of(follow_ions(sheath, argon, sampling).ions).mean_energy_ev();
        });
    const nlohmann::json line = {
        {"bench", "sheath"},
        {"ratio", c.ratio},
        {"closed_form_ms", 1e3 * c.ours},
        {"trajectories_100000_s", c.theirs},
        {"cached_read_ms", 1e3 * cached_read(sheath, argon, sampling)},
        {"mean_energy_closed_eV", mean_a},
        {"mean_energy_trajectories_eV", mean_b},
        {"note", "time of 100,000 trajectories over that of the closed form"}};
    std::cout << line.dump() << std::endl;
}
