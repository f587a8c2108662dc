// SPDX-License-Identifier: Apache-2.0
#include "fluxes/surface_step.hpp"

#include "fluxes/coupling.hpp"
#include "fluxes/direct_ions.hpp"
#include "fluxes/exact_exchange.hpp"
#include "fluxes/first_flight.hpp"
#include "fluxes/ion_tables.hpp"
#include "fluxes/reflected_ions.hpp"
#include "geometry/check.hpp"

#include <tbb/blocked_range.h>
#include <tbb/parallel_for.h>

#include <algorithm>
#include <chrono>
#include <map>
#include <optional>

namespace rille::fluxes {
namespace {

constexpr double pi = 3.14159265358979323846;

template <typename Body>
void for_elements(std::size_t n, const Body& body) {
    tbb::parallel_for(tbb::blocked_range<std::size_t>(0, n, 32), [&](const auto& range) {
        for (std::size_t e = range.begin(); e != range.end(); ++e)
            body(static_cast<int>(e));
    });
}

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

/// Everything ions bring to the elements at their own normals.
struct IonArrivals {
    std::shared_ptr<const IonTables> tables;
    std::optional<DirectIons> direct;
    int tallies = 0;             ///< of the mechanism
    std::vector<int> counts_for; ///< tally of the mechanism that each one of `direct` adds to
    std::vector<double> by_path; ///< [(element * ion_paths + path) * tallies + m], if asked for
    std::vector<std::vector<double>> by_path_batch; ///< [batch], where they are asked for
    std::vector<double> reflected;                  ///< [element][tally], mean over batches
    std::vector<double> reflected_from;             ///< ReflectedIons::from_angle, or empty
    std::vector<double> total;                      ///< [element][tally], direct and reflected
    std::vector<std::vector<double>> batch; ///< [batch][element][tally]: the same of one batch

    const double* at(int element, int b) const {
        return (b < 0 ? total : batch[b]).data() + std::size_t(element) * tallies;
    }
};

bool reflects(const std::vector<IonReflection>& laws) {
    return std::any_of(laws.begin(), laws.end(),
                       [](const IonReflection& law) { return law.probability > 0; });
}

/// Wall time by part; one part goes on until the next begins.
class PartClock {
public:
    using Part = double SurfaceStep::Seconds::*;
    void begin(Part part) {
        const auto now = std::chrono::steady_clock::now();
        if (part_) seconds_.*part_ += std::chrono::duration<double>(now - start_).count();
        part_ = part;
        start_ = now;
    }
    /// Ends the last part.
    SurfaceStep::Seconds stop() {
        begin(nullptr);
        return seconds_;
    }

private:
    SurfaceStep::Seconds seconds_;
    Part part_ = nullptr;
    std::chrono::steady_clock::time_point start_;
};

struct Setting {
    const geometry::Domain& domain;
    const geometry::Surface& surface;
    const geometry::RayCaster& caster;
    const MaterialsInReach& reach;
    const Mechanism& mechanism;
    const Sources& sources;
    const Sampling& sampling;
    mutable PartClock clock{};

    int outermost(int e) const { return reach.material[reach.first[e]]; }
    SurfaceResponse respond_at(int material, const double* tallies, const double* neutrals) const {
        return respond(mechanism, material, {tallies, neutrals, sources.wafer_temperature_k});
    }
};

/// Everything that comes to element e, by path and together.
void add_up(const ReflectedIons& bounced, std::size_t elements, int e, IonArrivals& ions) {
    const std::size_t m = ions.tallies, all = ions.counts_for.size();
    double* paths =
        ions.by_path.empty() ? nullptr : ions.by_path.data() + std::size_t(e) * ion_paths * m;
    for (std::size_t t = 0; t < all; ++t) {
        const std::size_t own = ions.counts_for[t], i = e * m + own;
        const auto path = [&](int p) { return (t < m ? p : ion_paths - 1) * m + own; };
        for (int b = 0; b < batches; ++b) {
            const double part = bounced.value.empty() ? 0 : bounced.value[b][t * elements + e];
            ions.reflected[i] += part / batches;
            ions.batch[b][i] += part + ions.direct->tally_batch(b, int(t), e);
        }
        if (!paths) continue;
        paths[path(0)] += ions.direct->tally(int(t), e);
        for (int k = 0; k < bounce_classes && !bounced.value.empty(); ++k)
            for (const auto& one : bounced.by_bounces)
                paths[path(k + 1)] +=
                    one[(k * all + t) * elements + e] / double(bounced.by_bounces.size());
        for (std::size_t b = 0; b < ions.by_path_batch.size(); ++b) {
            double* of_batch = ions.by_path_batch[b].data() + std::size_t(e) * ion_paths * m;
            of_batch[path(0)] += ions.direct->tally_batch(int(b), int(t), e);
            for (int k = 0; k < bounce_classes && !bounced.value.empty(); ++k)
                of_batch[path(k + 1)] += bounced.by_bounces[b][(k * all + t) * elements + e];
        }
    }
    for (std::size_t t = 0; t < all; ++t)
        ions.total[e * m + ions.counts_for[t]] += ions.direct->tally(int(t), e);
    for (std::size_t own = 0; own < m; ++own)
        ions.total[e * m + own] += ions.reflected[e * m + own];
}

IonArrivals gather_ions(const Setting& s, const std::vector<IonReflection>& reflection,
                        const SurfaceStep* previous) {
    s.clock.begin(&SurfaceStep::Seconds::direct_ions);
    IonArrivals ions;
    const std::size_t n = s.surface.size(), m = s.mechanism.tallies.size();
    ions.tallies = static_cast<int>(m);
    ions.reflected.assign(n * m, 0);
    ions.total.assign(n * m, 0);
    ions.batch.assign(batches, std::vector<double>(n * m, 0));
    const Sampling& sampling = s.sampling;
    const bool paths = sampling.detailed || sampling.causes;
    if (paths) ions.by_path.assign(n * ion_paths * m, 0);
    if (sampling.detailed) ions.by_path_batch.assign(batches, ions.by_path);
    if (s.sources.ions.empty()) return ions;
    AllSources all(s.mechanism, s.sources);
    ions.counts_for = std::move(all.counts_for);
    const std::size_t species = all.ions.size();
    if (previous && previous->ion_tables &&
        previous->ion_tables->serves(s.domain.symmetry, all.ions, all.tallies))
        ions.tables = previous->ion_tables;
    else
        ions.tables = std::make_shared<IonTables>(s.domain.symmetry, std::move(all.ions),
                                                  std::move(all.tallies));
    ions.direct.emplace(
        s.domain, s.surface, s.caster, ions.tables,
        DirectIons::Options{sampling.ion_directions, sampling.seed, sampling.refresh});
    ReflectedIons bounced;
    if (sampling.ions_per_species > 0 && m > 0 && reflects(reflection)) {
        s.clock.begin(&SurfaceStep::Seconds::reflected_ions);
        std::vector<int> material(n);
        for (std::size_t e = 0; e < n; ++e)
            material[e] = s.outermost(int(e));
        ReflectionOptions options{sampling.ions_per_species, sampling.seed, sampling.refresh};
        // Fast neutrals share the ions' number.
        options.ions_per_species =
            static_cast<int>(options.ions_per_species * s.sources.ions.size() / species);
        options.bounces = paths;
        options.bounces_by_batch = sampling.detailed;
        bounced = trace_reflected(s.domain, s.surface, s.caster, material, *ions.direct, reflection,
                                  options);
    }
    for_elements(n, [&](int e) { add_up(bounced, n, e, ions); });
    ions.reflected_from = std::move(bounced.from_angle);
    ions.direct->forget_rays();
    return ions;
}

/// Exact where the symmetry allows it, else from rays. Rays do not mind a surface that touches
/// itself, either; `inexact` then says why they were needed.
std::unique_ptr<ExchangeOperator> exchange_of(const Setting& s, std::string& inexact) {
    std::vector<int> material(s.surface.size());
    for (std::size_t e = 0; e < material.size(); ++e)
        material[e] = s.outermost(static_cast<int>(e));
    if (ExactExchange::serves(s.domain, s.surface)) {
        try {
            return std::make_unique<ExactExchange>(s.domain, s.surface, s.caster, material);
        } catch (const NumericsError& error) {
            inexact = error.what();
        }
    } else if (s.domain.planar_contour()) {
        inexact = "something floats in the gas";
    }
    const Exchange::Options options{s.sampling.rays_per_element, s.sampling.seed,
                                    s.sampling.refresh};
    return std::make_unique<Exchange>(s.domain, s.surface, s.caster, options);
}

/// Found once for all species that leave by the same law. Where all else is exact four times the
/// rays keep its error small.
const FirstFlight& first_flight(const Setting& s, double cosine_power,
                                std::map<double, FirstFlight>& flights) {
    const int rays = s.sampling.rays_per_element * (s.domain.planar_contour() ? 4 : 1);
    const FirstFlight::Options options{rays, s.sampling.seed, s.sampling.refresh};
    return flights.try_emplace(cosine_power, s.domain, s.surface, s.caster, cosine_power, options)
        .first->second;
}

/// Neutrals solved together with the sticking that the kinetics of the outermost material gives.
CoupledArrivals gather_neutrals(const Setting& s, const IonArrivals& ions,
                                const SurfaceStep* previous, std::string& inexact) {
    s.clock.begin(&SurfaceStep::Seconds::neutrals);
    CoupledArrivals none;
    none.batch_flux.resize(batches);
    if (s.sources.neutrals.empty()) return none;
    std::map<double, FirstFlight> flights; // by the power of the cosine
    std::vector<NeutralSupply> supply;
    for (const NeutralSource& source : s.sources.neutrals) {
        const std::size_t k = supply.size();
        supply.push_back({source.flux, s.mechanism.gives_off(k), nullptr});
        if (supply.back().given_off && s.mechanism.cosine_power[k] != 1)
            supply.back().first_flight = &first_flight(s, s.mechanism.cosine_power[k], flights);
    }
    const std::unique_ptr<ExchangeOperator> exchange = exchange_of(s, inexact);
    const AnswerOf answer = [&](int e, int batch, const double* neutrals) {
        const SurfaceResponse r = s.respond_at(s.outermost(e), ions.at(e, batch), neutrals);
        return NeutralAnswer{r.sticking, r.emitted};
    };
    static const std::vector<std::vector<double>> nothing;
    return solve_coupled(*exchange, supply, answer, previous ? previous->neutral : nothing);
}

std::array<double, max_species> at_element(const std::vector<std::vector<double>>& flux, int e) {
    std::array<double, max_species> values{};
    for (std::size_t k = 0; k < flux.size(); ++k)
        values[k] = flux[k][e];
    return values;
}

/// Rates of every material in reach of every element over the normal's angle.
void tabulate(const Setting& s, const IonArrivals& ions, SurfaceStep& step) {
    geometry::NormalRates& rates = step.rates;
    const bool any_ions = ions.direct && ions.tallies > 0;
    rates.angles = any_ions ? ions.direct->rate_angles()
                            : std::vector<double>{s.domain.planar_contour() ? -pi : 0.0, pi};
    rates.first_row = s.reach.first;
    rates.material = s.reach.material;
    const std::size_t angles = rates.angles.size();
    rates.table.assign(rates.material.size() * angles, 0);
    for_elements(s.surface.size(), [&](int e) {
        const auto neutrals = at_element(step.neutral, e);
        const double* bounced = ions.reflected.data() + std::size_t(e) * ions.tallies;
        const bool any_bounced =
            std::any_of(bounced, bounced + ions.tallies, [](double tally) { return tally != 0; });
        const geometry::Vec3& n = s.surface.normal[e];
        const double own = s.domain.planar_contour() ? std::atan2(n.x, n.z)
                                                     : std::acos(std::clamp(n.z, -1.0, 1.0));
        std::vector<double> tallies(ions.tallies), last;
        std::vector<DirectIons::TallyRow> direct(any_ions ? ions.counts_for.size() : 0);
        for (int m = 0; m < int(direct.size()); ++m)
            direct[m] = ions.direct->tally_row(m, e);
        for (std::size_t a = 0; a < angles; ++a) {
            const double left =
                ions.reflected_from.empty() || !any_bounced
                    ? 1.0
                    : share_after_turn(own, ions.reflected_from[e], rates.angles[a]);
            for (int m = 0; m < ions.tallies; ++m)
                tallies[m] = left * bounced[m];
            for (std::size_t m = 0; m < direct.size(); ++m)
                tallies[ions.counts_for[m]] += direct[m].factor * direct[m].value[a];
            const bool same = a > 0 && tallies == last; // turned away from every ion, or no ions
            for (int row = rates.first_row[e]; row < rates.first_row[e + 1]; ++row) {
                double* value = rates.table.data() + std::size_t(row) * angles + a;
                *value =
                    same ? value[-1]
                         : s.respond_at(rates.material[row], tallies.data(), neutrals.data()).rate;
            }
            last = tallies;
        }
    });
}

template <class Rates>
void put(const Rates& rates, int e, CauseFields& fields) {
    for (std::size_t c = 0; c < fields.size(); ++c)
        fields[c][e] = rates[c];
}

void respond_everywhere(const Setting& s, const IonArrivals& ions,
                        const std::vector<std::vector<std::vector<double>>>& batch_flux,
                        SurfaceStep& step, SurfaceDetail* detail) {
    const std::size_t n = s.surface.size();
    step.response.resize(n);
    step.growth_material.assign(n, -1);
    step.rate_batch.assign(batches, std::vector<double>(n, 0));
    const std::size_t supplies = ion_paths + s.mechanism.neutrals.size();
    const bool causes = detail || s.sampling.causes;
    if (causes) {
        step.cause.assign(cause_count, std::vector<double>(n, 0));
        step.supply.assign(supplies, std::vector<double>(n, 0));
    }
    if (detail) detail->cause_batch.assign(batches, step.cause);
    for_elements(n, [&](int e) {
        const int material = s.outermost(e);
        const auto neutrals = at_element(step.neutral, e);
        const SurfaceResponse r = s.respond_at(material, ions.at(e, -1), neutrals.data());
        step.response[e] = r;
        step.growth_material[e] = r.rate < 0 ? r.grown_material : r.settling_material;
        const std::size_t paths = std::size_t(e) * ion_paths * ions.tallies;
        if (causes) {
            put(cause_rates(s.mechanism, material, r, &ions.by_path[paths]), e, step.cause);
            put(supply_rates(s.mechanism, material,
                             {ions.at(e, -1), neutrals.data(), s.sources.wafer_temperature_k},
                             &ions.by_path[paths]),
                e, step.supply);
        }
        for (int b = 0; b < batches; ++b) {
            const auto of_batch = at_element(batch_flux[b], e);
            const SurfaceResponse one = s.respond_at(material, ions.at(e, b), of_batch.data());
            step.rate_batch[b][e] = one.rate;
            if (detail)
                put(cause_rates(s.mechanism, material, one, &ions.by_path_batch[b][paths]), e,
                    detail->cause_batch[b]);
        }
    });
}

} // namespace

SurfaceStep solve_surface(const geometry::Domain& domain, const geometry::Surface& surface,
                          const geometry::RayCaster& caster, const MaterialsInReach& reach,
                          const Mechanism& mechanism, const std::vector<IonReflection>& reflection,
                          const Sources& sources, const Sampling& sampling,
                          const SurfaceStep* previous) {
    const std::size_t n = surface.size();
    RILLE_CHECK(reach.first.size() == n + 1, "materials in reach of every element");
    RILLE_CHECK(sources.neutrals.size() <= std::size_t(max_species), "too many neutral species");
    for (std::size_t e = 0; e < n; ++e)
        RILLE_CHECK(reach.first[e] < reach.first[e + 1], "at least one material in reach");
    const Setting setting{domain, surface, caster, reach, mechanism, sources, sampling};
    IonArrivals ions = gather_ions(setting, reflection, previous);
    SurfaceStep step;
    CoupledArrivals neutrals = gather_neutrals(setting, ions, previous, step.inexact);

    setting.clock.begin(&SurfaceStep::Seconds::kinetics);
    step.ion_tables = ions.tables;
    step.neutral = std::move(neutrals.flux);
    step.iterations = neutrals.iterations;
    step.residual = neutrals.residual;
    step.ion_flux.assign(sources.ions.size(), std::vector<double>(n, 0));
    for (std::size_t i = 0; i < sources.ions.size(); ++i)
        for (std::size_t e = 0; e < n; ++e)
            step.ion_flux[i][e] = ions.direct->flux(int(i), int(e));
    step.fast_neutral_flux.resize(sources.ions.size());
    for (std::size_t f = 0; f < sources.fast_neutrals.size(); ++f)
        for (std::size_t e = 0; e < n; ++e)
            step.fast_neutral_flux[sources.fast_neutrals[f].ion].push_back(
                ions.direct->flux(int(sources.ions.size() + f), int(e)));
    std::shared_ptr<SurfaceDetail> detail;
    if (sampling.detailed) detail = std::make_shared<SurfaceDetail>();
    respond_everywhere(setting, ions, neutrals.batch_flux, step, detail.get());
    tabulate(setting, ions, step);
    if (detail) {
        detail->tallies = ions.tallies;
        detail->by_path = std::move(ions.by_path);
        detail->by_path_batch = std::move(ions.by_path_batch);
        detail->neutral_batch = std::move(neutrals.batch_flux);
        step.detail = std::move(detail);
    }
    step.seconds = setting.clock.stop();
    return step;
}

} // namespace rille::fluxes
