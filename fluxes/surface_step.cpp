// SPDX-License-Identifier: Apache-2.0
#include "fluxes/surface_step.hpp"

#include "fluxes/coupling.hpp"
#include "fluxes/exact_exchange.hpp"
#include "fluxes/first_flight.hpp"
#include "fluxes/ion_arrivals.hpp"
#include "geometry/check.hpp"

#include <algorithm>
#include <map>
#include <memory>

namespace rille::fluxes {
namespace {

constexpr double pi = 3.14159265358979323846;

SurfaceResponse respond_at(const Setting& s, const IonArrivals& ions, int material,
                           const double* tallies, const double* neutrals) {
    return respond(ions.sums.mechanism, material,
                   {tallies, neutrals, s.sources.wafer_temperature_k});
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
        const SurfaceResponse r = respond_at(s, ions, s.outermost(e), ions.at(e, batch), neutrals);
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

/// Rates of the materials in reach of an element over the normal's angle; `rows`: of the direct
/// ions, or null.
void tabulate(const Setting& s, const IonArrivals& ions, int e, const DirectIons::Rows* rows,
              SurfaceStep& step) {
    geometry::NormalRates& rates = step.rates;
    const std::size_t angles = rates.angles.size(), sums = ions.sums.members.size();
    const geometry::Vec3& n = s.surface.normal[e];
    const double turned =
        s.domain.planar_contour() ? std::atan2(n.x, n.z) : std::acos(std::clamp(n.z, -1.0, 1.0));
    std::vector<double> left(angles, 1.0);
    const double* bounced = ions.bounced.data() + e * sums;
    if (!ions.reflected.from_angle.empty()) {
        const bool any = std::any_of(bounced, bounced + sums, [](double sum) { return sum != 0; });
        for (std::size_t a = 0; any && a < angles; ++a)
            left[a] = share_after_turn(turned, ions.reflected.from_angle[e], rates.angles[a]);
    }
    const auto neutrals = at_element(step.neutral, e);
    const NodeRange nodes = rows ? rows->nodes : NodeRange{0, static_cast<int>(angles)};
    std::vector<double> tallies(ions.tallies), last;
    for (int row = rates.first_row[e]; row < rates.first_row[e + 1]; ++row) {
        const int material = rates.material[row];
        const std::vector<int>& acting = ions.sums.of_material[material];
        double* value = rates.table.data() + std::size_t(row) * angles;
        for (int a = nodes.first; a < nodes.end; ++a) {
            for (std::size_t i = 0; i < acting.size(); ++i)
                tallies[i] = left[a] * bounced[acting[i]];
            for (std::size_t i = 0; rows && i < acting.size(); ++i)
                tallies[i] += rows->row(acting[i])[a];
            for (std::size_t t = sums; rows && t < ions.adds_to.size(); ++t)
                for (std::size_t i = 0; i < acting.size(); ++i)
                    if (acting[i] == ions.adds_to[t]) tallies[i] += rows->row(int(t))[a];
            // The same when turned away from every ion, or without ions.
            value[a] = a > nodes.first && tallies == last
                           ? value[a - 1]
                           : respond_at(s, ions, material, tallies.data(), neutrals.data()).rate;
            last = tallies;
        }
        std::fill(value, value + nodes.first, value[nodes.first]);
        std::fill(value + nodes.end, value + angles, value[nodes.end - 1]);
    }
}

void tabulate(const Setting& s, const IonArrivals& ions, SurfaceStep& step) {
    geometry::NormalRates& rates = step.rates;
    const bool any_ions = ions.direct && ions.tallies > 0;
    rates.angles = any_ions ? ions.direct->rate_angles()
                            : std::vector<double>{s.domain.planar_contour() ? -pi : 0.0, pi};
    rates.first_row = s.reach.first;
    rates.material = s.reach.material;
    rates.table.assign(rates.material.size() * rates.angles.size(), 0);
    if (any_ions)
        ions.direct->visit_rows(
            [&](int e, const DirectIons::Rows& rows) { tabulate(s, ions, e, &rows, step); });
    else
        for_elements(s.surface.size(), [&](const auto& elements) {
            for (int e = elements.begin(); e != elements.end(); ++e)
                tabulate(s, ions, e, nullptr, step);
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
    const auto at_once = [&](int e) {
        const int material = s.outermost(e);
        const auto neutrals = at_element(step.neutral, e);
        const SurfaceResponse r = respond_at(s, ions, material, ions.at(e, -1), neutrals.data());
        step.response[e] = r;
        step.growth_material[e] = r.rate < 0 ? r.grown_material : r.settling_material;
        const std::size_t paths = std::size_t(e) * ion_paths * ions.tallies;
        if (causes) {
            put(cause_rates(ions.sums.mechanism, material, r, &ions.by_path[paths]), e, step.cause);
            put(supply_rates(ions.sums.mechanism, material,
                             {ions.at(e, -1), neutrals.data(), s.sources.wafer_temperature_k},
                             &ions.by_path[paths]),
                e, step.supply);
        }
        for (int b = 0; b < batches; ++b) {
            const auto of_batch = at_element(batch_flux[b], e);
            const SurfaceResponse one =
                respond_at(s, ions, material, ions.at(e, b), of_batch.data());
            step.rate_batch[b][e] = one.rate;
            if (detail)
                put(cause_rates(ions.sums.mechanism, material, one, &ions.by_path_batch[b][paths]),
                    e, detail->cause_batch[b]);
        }
    };
    for_elements(n, [&](const auto& elements) {
        for (int e = elements.begin(); e != elements.end(); ++e)
            at_once(e);
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
    if (detail) {
        detail->tallies = ions.tallies;
        detail->by_path = std::move(ions.by_path);
        detail->by_path_batch = std::move(ions.by_path_batch);
        detail->neutral_batch = std::move(neutrals.batch_flux);
        step.detail = std::move(detail);
    }
    neutrals = {};
    ions.forget_own_normals();
    tabulate(setting, ions, step);
    step.seconds = setting.clock.stop();
    return step;
}

} // namespace rille::fluxes
