// SPDX-License-Identifier: Apache-2.0
#include "fluxes/mechanism.hpp"

#include "fluxes/surface_chemistry.hpp"
#include "geometry/check.hpp"

#include <algorithm>
#include <cmath>

namespace rille::fluxes {

Mechanism::Mechanism() = default;
Mechanism::~Mechanism() = default;
Mechanism::Mechanism(const Mechanism&) = default;
Mechanism& Mechanism::operator=(const Mechanism&) = default;
Mechanism::Mechanism(Mechanism&&) noexcept = default;
Mechanism& Mechanism::operator=(Mechanism&&) noexcept = default;

double Arrhenius::at(double temperature_k) const {
    constexpr double boltzmann_ev = 8.617333262e-5; // eV/K, CODATA 2018
    if (activation_ev == 0.0) return value;
    return value *
           std::exp(-activation_ev / boltzmann_ev * (1.0 / temperature_k - 1.0 / reference_k));
}

namespace {

using PerCoverage = std::array<double, max_species>;

struct Inputs {
    const LocalArrivals& arrivals;

    double sum(const Tallies& tallies) const {
        double total = 0.0;
        for (const int m : tallies)
            total += arrivals.tallies[m];
        return total;
    }
    double neutral(int k) const { return arrivals.neutrals[k]; }
    double flux(const Arrhenius& a) const { return a.at(arrivals.temperature_k); }
    double probability(const Arrhenius& a) const { return std::fmin(flux(a), 1.0); }
    double sticking(double bare, const IonAssistance& a) const {
        return a.eta > 0.0 ? std::fmin(bare * (1.0 + a.eta * sum(a.tallies)), 1.0) : bare;
    }
};

/// Site balance of all adsorbates, in nm^-2 s^-1.
struct Balance {
    PerCoverage gain{};    ///< onto a bare surface
    PerCoverage loss{};    ///< from a fully covered one
    PerCoverage deposit{}; ///< of a film onto itself
    PerCoverage film_density{};
    std::array<int, max_species> film_material{};
};

/// First pass: what every process adds to the balance.
struct Collect {
    Inputs in;
    Balance& b;

    void operator()(const Adsorption& p) const {
        b.gain[p.coverage] +=
            p.atoms * in.sticking(p.sticking, p.assistance) * in.neutral(p.neutral);
    }
    void operator()(const IonAdsorption& p) const { b.gain[p.coverage] += in.sum(p.tallies); }
    void operator()(const Desorption& p) const { b.loss[p.coverage] += in.flux(p.flux); }
    void operator()(const IonEnhancedEtching& p) const {
        b.loss[p.coverage] += p.atoms * in.sum(p.tallies);
    }
    void operator()(const ThermalEtching& p) const { b.loss[p.coverage] += in.flux(p.flux); }
    void operator()(const IonRemoval& p) const { b.loss[p.coverage] += in.sum(p.tallies); }
    void operator()(const NeutralRemoval& p) const {
        b.loss[p.coverage] += p.atoms * in.probability(p.probability) * in.neutral(p.neutral);
    }
    void operator()(const Deposition& p) const {
        if (p.coverage < 0) return;
        b.deposit[p.coverage] += in.sticking(p.sticking, p.assistance) * in.neutral(p.neutral);
        b.film_density[p.coverage] = p.film_density;
        b.film_material[p.coverage] = p.film_material;
    }
    void operator()(const Recombination&) const {}
    void operator()(const PhysicalSputtering&) const {}
    void operator()(const SpontaneousEtching&) const {}
};

struct Coverage {
    PerCoverage theta{};
    double bare = 1.0;
    int growing = -1;    ///< coverage whose film grows
    double growth = 0.0; ///< [nm/s] >= 0
};

/// The fastest film with more deposited than removed covers everything.
bool find_growth(const Balance& b, int count, Coverage& c) {
    for (int j = 0; j < count; ++j) {
        if (!(b.deposit[j] > b.loss[j]) || b.gain[j] <= 0.0) continue;
        const double speed = (b.deposit[j] - b.loss[j]) / b.film_density[j];
        if (speed > c.growth) {
            c.growth = speed;
            c.growing = j;
        }
    }
    return c.growing >= 0;
}

/// theta_j = a_j / (1 + sum a), a_j = gain_j / loss_j. Where nothing removes an adsorbate, a_j is
/// infinite and it covers everything; several such adsorbates have no unique steady state, and get
/// the one that a bare surface reaches: shares in proportion to their gains.
Coverage solve(const Balance& b, int count) {
    constexpr double negligible = 1e-200; // keeps every ratio and sum finite
    Coverage c;
    if (find_growth(b, count, c)) {
        c.bare = 0.0;
        c.theta[c.growing] = 1.0;
        return c;
    }
    double unopposed = 0.0, total = 1.0;
    for (int j = 0; j < count; ++j) {
        if (b.gain[j] <= 0.0) continue;
        const double loss = b.loss[j] - b.deposit[j];
        if (loss > negligible * b.gain[j])
            total += c.theta[j] = b.gain[j] / loss;
        else
            unopposed += b.gain[j];
    }
    for (int j = 0; j < count; ++j) {
        const bool stays = b.gain[j] > 0.0 && !(b.loss[j] - b.deposit[j] > negligible * b.gain[j]);
        if (unopposed > 0.0)
            c.theta[j] = stays ? b.gain[j] / unopposed : 0.0;
        else
            c.theta[j] /= total;
    }
    c.bare = unopposed > 0.0 ? 0.0 : 1.0 / total;
    return c;
}

/// Second pass: rates and sticking probabilities at the solved coverages.
struct Act {
    Inputs in;
    const Coverage& c;
    double not_film; ///< share of the surface outside films
    double density;
    SurfaceResponse& r;

    double share(const SurfacePart& part) const {
        switch (part.kind) {
        case SurfacePart::Kind::bare:
            return c.bare;
        case SurfacePart::Kind::covered:
            return c.theta[part.coverage];
        case SurfacePart::Kind::whole:
            break;
        }
        return not_film;
    }
    void operator()(const Adsorption& p) const {
        r.sticking[p.neutral] += in.sticking(p.sticking, p.assistance) * c.bare;
    }
    void operator()(const Recombination& p) const {
        r.sticking[p.neutral] += in.probability(p.probability) * share(p.on);
    }
    void operator()(const IonEnhancedEtching& p) const {
        r.by_ion_enhanced += in.sum(p.tallies) * c.theta[p.coverage] / density;
    }
    void operator()(const PhysicalSputtering& p) const {
        r.by_sputtering += in.sum(p.tallies) * share(p.on) / density;
    }
    void operator()(const SpontaneousEtching& p) const {
        const double reacted = in.probability(p.probability) * share(p.on);
        r.sticking[p.neutral] += reacted;
        r.by_spontaneous += reacted * in.neutral(p.neutral) / (p.atoms * density);
    }
    void operator()(const ThermalEtching& p) const {
        r.by_spontaneous += in.flux(p.flux) * c.theta[p.coverage] / (p.atoms * density);
    }
    void operator()(const NeutralRemoval& p) const {
        r.sticking[p.neutral] += in.probability(p.probability) * c.theta[p.coverage];
    }
    void operator()(const Deposition& p) const {
        const double s = in.sticking(p.sticking, p.assistance);
        r.sticking[p.neutral] += p.coverage < 0 ? s : s * c.theta[p.coverage];
        if (p.coverage >= 0) return;
        r.by_deposition -= s * in.neutral(p.neutral) / p.film_density;
        r.grown_material = p.film_material;
    }
    void operator()(const IonAdsorption&) const {}
    void operator()(const Desorption&) const {}
    void operator()(const IonRemoval&) const {}
};

} // namespace

SurfaceResponse respond(const Mechanism& mechanism, int material, const LocalArrivals& arrivals) {
    RILLE_CHECK(material >= 0 && material < static_cast<int>(mechanism.surfaces.size()),
                "material out of range");
    const SurfaceChemistry& surface = mechanism.surfaces[material];
    const Inputs in{arrivals};
    const int count = static_cast<int>(surface.coverages.size());
    SurfaceResponse r;
    Balance balance;
    for (const SurfaceProcess& p : surface.processes)
        std::visit(Collect{in, balance}, p);
    const Coverage c = solve(balance, count);
    double not_film = 1.0;
    for (int j = 0; j < count; ++j) {
        r.coverage[j] = c.theta[j];
        if (balance.film_density[j] > 0.0) not_film -= c.theta[j];
    }
    r.bare = c.bare;
    r.outside_films = std::fmax(not_film, 0.0);
    const Act act{in, c, r.outside_films, surface.density, r};
    for (const SurfaceProcess& p : surface.processes)
        std::visit(act, p);
    if (c.growing >= 0) {
        r.by_deposition -= c.growth;
        r.grown_material = balance.film_material[c.growing];
    }
    for (double& s : r.sticking)
        s = std::fmin(s, 1.0);
    r.rate = r.by_ion_enhanced + r.by_sputtering + r.by_spontaneous + r.by_deposition;
    if (!(r.rate < 0.0)) r.grown_material = -1;
    return r;
}

std::vector<int> deposited_materials(const Mechanism& mechanism) {
    std::vector<int> found;
    for (const SurfaceChemistry& surface : mechanism.surfaces)
        for (const SurfaceProcess& process : surface.processes)
            if (const auto* deposition = std::get_if<Deposition>(&process))
                if (deposition->film_material >= 0) found.push_back(deposition->film_material);
    std::sort(found.begin(), found.end());
    found.erase(std::unique(found.begin(), found.end()), found.end());
    return found;
}

} // namespace rille::fluxes
