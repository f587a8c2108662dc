// SPDX-License-Identifier: Apache-2.0
#include "fluxes/ion_arrivals.hpp"

#include "geometry/normals_nearby.hpp"

#include <algorithm>
#include <numeric>

namespace rille::fluxes {
namespace {

/// Ions and fast neutrals as one list of sources: the mechanism's ions first, and each fast neutral
/// with tallies of its own, which count for those of the ion that it was.
struct AllSources {
    std::vector<IonSource> ions;
    std::vector<Tally> tallies;
    std::vector<int> counts_for; ///< tally of the mechanism that each one adds to

    AllSources(const Mechanism& mechanism, const Sources& sources)
        : ions(sources.ions), tallies(mechanism.tallies) {
        for (const FastNeutrals& fast : sources.fast_neutrals) {
            for (const Tally& tally : mechanism.tallies)
                if (tally.ion == fast.ion)
                    tallies.push_back({static_cast<int>(ions.size()), tally.yield});
            ions.push_back(fast.source);
        }
        for (int m = 0; m < static_cast<int>(mechanism.tallies.size()); ++m)
            counts_for.push_back(m);
        for (const FastNeutrals& fast : sources.fast_neutrals)
            for (int m = 0; m < static_cast<int>(mechanism.tallies.size()); ++m)
                if (mechanism.tallies[m].ion == fast.ion) counts_for.push_back(m);
    }
};

bool reflects(const std::vector<IonReflection>& laws) {
    return std::any_of(laws.begin(), laws.end(),
                       [](const IonReflection& law) { return law.probability > 0; });
}

/// The sums to ask of the transport: those by ions, and those that have any by fast neutrals.
WantedSums wanted_sums(const Setting& s, const AllSources& all, IonArrivals& ions) {
    WantedSums wanted{ions.sums.members, ions.sums.of_material, &s.reach};
    ions.adds_to.resize(wanted.members.size());
    std::iota(ions.adds_to.begin(), ions.adds_to.end(), 0);
    const int tallies = static_cast<int>(s.mechanism.tallies.size());
    for (int sum = 0; sum < int(ions.sums.members.size()); ++sum) {
        std::vector<int> fast;
        for (const int m : ions.sums.members[sum])
            for (int t = tallies; t < int(all.counts_for.size()); ++t)
                if (all.counts_for[t] == m) fast.push_back(t);
        if (fast.empty()) continue;
        for (std::size_t material = 0; material < ions.sums.of_material.size(); ++material) {
            const std::vector<int>& acting = ions.sums.of_material[material];
            if (std::find(acting.begin(), acting.end(), sum) != acting.end())
                wanted.of_material[material].push_back(int(wanted.members.size()));
        }
        wanted.members.push_back(std::move(fast));
        ions.adds_to.push_back(sum);
    }
    return wanted;
}

/// Nodes of the angles at which the front may ask for rates of an element: those of the normals
/// about it and a right angle to either side. The front looks no further than its band;
/// cells at the edge of that, whose slopes mean nothing, may ask beyond and get the last value
/// held.
std::vector<NodeRange> askable(const Setting& s, const std::vector<double>& angles) {
    constexpr double reach_cells = 8, margin = 0.5 * 3.14159265358979323846;
    std::vector<NodeRange> nodes;
    const int last = static_cast<int>(angles.size()) - 1;
    for (const auto& near :
         geometry::normals_nearby(s.domain, s.surface, reach_cells * s.domain.spacing)) {
        const auto above = std::upper_bound(angles.begin(), angles.end(), near.low - margin);
        const auto below = std::lower_bound(angles.begin(), angles.end(), near.high + margin);
        nodes.push_back({std::max(0, static_cast<int>(above - angles.begin()) - 1),
                         std::min(last, static_cast<int>(below - angles.begin())) + 1});
    }
    return nodes;
}

/// Everything that comes to element e, by path and together.
void add_up(const Setting& s, int e, std::vector<double>& reflected, IonArrivals& ions) {
    const std::size_t m = ions.tallies, sums = ions.adds_to.size();
    const std::vector<int>& acting = ions.sums.of_material[s.outermost(e)];
    const std::vector<int>& wanted = ions.direct->wanted().of(e);
    const DirectIons::Own own = ions.direct->own(e);
    const auto add = [&](std::vector<double>& paths, int path, std::size_t i, double value) {
        if (!paths.empty()) paths[(std::size_t(e) * ion_paths + path) * m + i] += value;
    };
    ions.reflected.at(e, reflected);
    double* bounced = ions.bounced.data() + e * ions.sums.members.size();
    for (std::size_t slot = 0; slot < reflected.size(); ++slot)
        bounced[ions.adds_to[slot % sums]] += reflected[slot] / batches;
    for (std::size_t j = 0; j < wanted.size(); ++j) {
        const bool fast = ions.by_fast_neutrals(wanted[j]);
        const std::size_t i =
            std::find(acting.begin(), acting.end(), ions.adds_to[wanted[j]]) - acting.begin();
        add(ions.by_path, fast ? ion_paths - 1 : 0, i, own.value[j]);
        ions.total[e * m + i] += own.value[j];
        for (int b = 0; b < batches; ++b) {
            std::vector<double>* paths =
                ions.by_path_batch.empty() ? nullptr : &ions.by_path_batch[b];
            const double direct = own.batch ? own.batch[j * batches + b] : own.value[j];
            double all = 0;
            if (paths) add(*paths, fast ? ion_paths - 1 : 0, i, direct);
            for (int k = 0; k < bounce_classes; ++k) {
                const double part = reflected[(b * bounce_classes + k) * sums + wanted[j]];
                const int path = fast ? ion_paths - 1 : k + 1;
                all += part;
                add(ions.by_path, path, i, part / batches);
                if (paths) add(*paths, path, i, part);
            }
            ions.total[e * m + i] += all / batches;
            ions.batch[b][e * m + i] += direct + all;
        }
    }
}

} // namespace

IonArrivals gather_ions(const Setting& s, const std::vector<IonReflection>& reflection,
                        const SurfaceStep* previous) {
    s.clock.begin(&SurfaceStep::Seconds::direct_ions);
    IonArrivals ions;
    const Sampling& sampling = s.sampling;
    ions.sums = sampling.detailed ? every_tally(s.mechanism) : sum_tallies(s.mechanism);
    const std::size_t n = s.surface.size(), m = ions.sums.mechanism.tallies.size();
    ions.tallies = static_cast<int>(m);
    ions.bounced.assign(n * ions.sums.members.size(), 0);
    ions.total.assign(n * m, 0);
    ions.batch.assign(batches, std::vector<double>(n * m, 0));
    const bool paths = sampling.detailed || sampling.causes;
    if (paths) ions.by_path.assign(n * ion_paths * m, 0);
    if (sampling.detailed) ions.by_path_batch.assign(batches, ions.by_path);
    if (s.sources.ions.empty()) return ions;
    AllSources all(s.mechanism, s.sources);
    WantedSums wanted = wanted_sums(s, all, ions);
    const std::size_t species = all.ions.size();
    if (previous && previous->ion_tables &&
        previous->ion_tables->serves(s.domain.symmetry, all.ions, all.tallies))
        ions.tables = previous->ion_tables;
    else
        ions.tables = std::make_shared<IonTables>(s.domain.symmetry, std::move(all.ions),
                                                  std::move(all.tallies));
    if (s.domain.extruded()) wanted.nodes = askable(s, ions.tables->angles());
    ions.direct = std::make_unique<DirectIons>(
        s.domain, s.surface, s.caster, ions.tables, std::move(wanted),
        DirectIons::Options{sampling.ion_directions, sampling.seed, sampling.refresh});
    if (sampling.ions_per_species > 0 && m > 0 && reflects(reflection)) {
        s.clock.begin(&SurfaceStep::Seconds::reflected_ions);
        std::vector<int> material(n);
        for (std::size_t e = 0; e < n; ++e)
            material[e] = s.outermost(int(e));
        ReflectionOptions options{sampling.ions_per_species, sampling.seed, sampling.refresh};
        // Fast neutrals share the ions' number.
        options.ions_per_species =
            static_cast<int>(options.ions_per_species * s.sources.ions.size() / species);
        ions.reflected = trace_reflected(s.domain, s.surface, s.caster, material, *ions.direct,
                                         reflection, options);
    }
    ions.reflected.sums = static_cast<int>(ions.adds_to.size());
    for_elements(n, [&](const auto& elements) {
        std::vector<double> reflected;
        for (int e = elements.begin(); e != elements.end(); ++e)
            add_up(s, e, reflected, ions);
    });
    ions.direct->forget_own();
    return ions;
}

} // namespace rille::fluxes
