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
    PerCoverage settling{}; ///< redeposits, onto any site
    PerCoverage stripped{}; ///< redeposits, from a surface fully covered by this one
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
    void operator()(const Redeposition& p) const {
        b.settling[p.coverage] += p.sticking * in.neutral(p.neutral);
        for (const FilmRemoval& removal : p.removal)
            b.stripped[p.coverage] += in.sum(removal.tallies);
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
    int growing = -1;     ///< coverage whose film grows
    double growth = 0.0;  ///< [nm/s] >= 0
    PerCoverage piling{}; ///< growth of redeposits [nm/s] >= 0
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

/// Net growth g > 0 at which sum of settling / (g + stripped) is 1; that sum is convex in g and
/// above 1 where the search starts, so Newton's method comes to the root from one side.
double piling_speed(const Balance& b, int count) {
    double all = 0.0, most_stripped = 0.0, g = 0.0;
    for (int j = 0; j < count; ++j) {
        if (!(b.settling[j] > 0.0)) continue;
        all += b.settling[j];
        most_stripped = std::fmax(most_stripped, b.stripped[j]);
        g = std::fmax(g, b.settling[j] - b.stripped[j]);
    }
    g = std::fmax(g, all - most_stripped);
    for (int i = 0; i < 200; ++i) {
        double above = -1.0, slope = 0.0;
        for (int j = 0; j < count; ++j) {
            if (!(b.settling[j] > 0.0)) continue;
            const double part = b.settling[j] / (g + b.stripped[j]);
            above += part;
            slope += part / (g + b.stripped[j]);
        }
        if (!(above > 1e-14)) break;
        g += above / slope;
    }
    return g;
}

/// Redeposits lay themselves over everything else.
void lay_redeposits(const Balance& b, int count, Coverage& c) {
    double covered = 0.0;
    for (int j = 0; j < count; ++j)
        if (b.settling[j] > 0.0)
            covered += b.stripped[j] > 0.0 ? b.settling[j] / b.stripped[j] : HUGE_VAL;
    if (covered == 0.0) return;
    const double speed = covered < 1.0 ? 0.0 : piling_speed(b, count);
    const double left = covered < 1.0 ? 1.0 - covered : 0.0;
    c.bare *= left;
    c.growth *= left;
    for (int j = 0; j < count; ++j) {
        c.theta[j] *= left;
        if (!(b.settling[j] > 0.0)) continue;
        c.theta[j] = std::fmin(b.settling[j] / (speed + b.stripped[j]), 1.0);
        c.piling[j] = speed * c.theta[j] / b.film_density[j];
    }
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
    void give_off(const Leavings& leaves, double units) const {
        for (const Leaving& l : leaves)
            r.emitted[l.neutral] += l.per_unit * units;
    }
    void operator()(const Adsorption& p) const {
        r.sticking[p.neutral] += in.sticking(p.sticking, p.assistance) * c.bare;
    }
    void operator()(const Recombination& p) const {
        r.sticking[p.neutral] += in.probability(p.probability) * share(p.on);
    }
    void operator()(const IonEnhancedEtching& p) const {
        r.by_ion_enhanced += in.sum(p.tallies) * c.theta[p.coverage] / density;
        give_off(p.leaves, in.sum(p.tallies) * c.theta[p.coverage]);
    }
    void operator()(const PhysicalSputtering& p) const {
        r.by_sputtering += in.sum(p.tallies) * share(p.on) / density;
        give_off(p.leaves, in.sum(p.tallies) * share(p.on));
    }
    void operator()(const SpontaneousEtching& p) const {
        const double reacted = in.probability(p.probability) * share(p.on);
        r.sticking[p.neutral] += reacted;
        r.by_spontaneous += reacted * in.neutral(p.neutral) / (p.atoms * density);
        give_off(p.leaves, reacted * in.neutral(p.neutral) / p.atoms);
    }
    void operator()(const ThermalEtching& p) const {
        r.by_spontaneous += in.flux(p.flux) * c.theta[p.coverage] / (p.atoms * density);
        give_off(p.leaves, in.flux(p.flux) * c.theta[p.coverage] / p.atoms);
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
    void operator()(const IonRemoval& p) const {
        if (!p.leaves.empty()) give_off(p.leaves, in.sum(p.tallies) * c.theta[p.coverage]);
    }
    void operator()(const Redeposition& p) const {
        r.sticking[p.neutral] += p.sticking;
        for (const FilmRemoval& removal : p.removal)
            give_off(removal.leaves, in.sum(removal.tallies) * c.theta[p.coverage]);
    }
    void operator()(const IonAdsorption&) const {}
    void operator()(const Desorption&) const {}
};

/// The film for which most comes to stay of what surfaces gave off, or -1.
int settling_film(const Mechanism& m, const SurfaceChemistry& surface, const Inputs& in) {
    int material = -1;
    double most = 0.0;
    const auto compare = [&](int neutral, double sticking, double density, int film) {
        const double speed = sticking * in.neutral(neutral) / density;
        if (!(speed > most)) return;
        most = speed;
        material = film;
    };
    for (const SurfaceProcess& process : surface.processes) {
        if (const auto* r = std::get_if<Redeposition>(&process))
            compare(r->neutral, r->sticking, r->film_density, r->film_material);
        const auto* d = std::get_if<Deposition>(&process);
        if (d && d->coverage < 0 && m.gives_off(d->neutral))
            compare(d->neutral, d->sticking, d->film_density, d->film_material);
    }
    return material;
}

/// What redeposits add to the growth, and which film grows fastest.
void pile_up(const Balance& b, const Coverage& c, int count, SurfaceResponse& r) {
    double fastest = -r.by_deposition;
    for (int j = 0; j < count; ++j) {
        r.by_deposition -= c.piling[j];
        if (!(c.piling[j] > fastest)) continue;
        fastest = c.piling[j];
        r.grown_material = b.film_material[j];
    }
}

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
    Coverage c = solve(balance, count);
    lay_redeposits(balance, count, c);
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
    pile_up(balance, c, count, r);
    for (double& s : r.sticking)
        s = std::fmin(s, 1.0);
    r.rate = r.by_ion_enhanced + r.by_sputtering + r.by_spontaneous + r.by_deposition;
    if (!(r.rate < 0.0)) r.grown_material = -1;
    if (!mechanism.cosine_power.empty())
        r.settling_material = settling_film(mechanism, surface, in);
    return r;
}

namespace {

std::vector<int> film_materials(const Mechanism& mechanism, bool of_by_products_only) {
    std::vector<int> found;
    for (const SurfaceChemistry& surface : mechanism.surfaces)
        for (const SurfaceProcess& process : surface.processes) {
            const auto* deposition = std::get_if<Deposition>(&process);
            if (deposition && deposition->film_material >= 0 &&
                (!of_by_products_only ||
                 (deposition->coverage < 0 && mechanism.gives_off(deposition->neutral))))
                found.push_back(deposition->film_material);
            if (const auto* redeposition = std::get_if<Redeposition>(&process))
                found.push_back(redeposition->film_material);
        }
    std::sort(found.begin(), found.end());
    found.erase(std::unique(found.begin(), found.end()), found.end());
    return found;
}

} // namespace

std::vector<int> deposited_materials(const Mechanism& mechanism) {
    return film_materials(mechanism, false);
}

std::vector<int> redeposited_materials(const Mechanism& mechanism) {
    return film_materials(mechanism, true);
}

} // namespace rille::fluxes
