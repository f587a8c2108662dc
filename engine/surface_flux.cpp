// SPDX-License-Identifier: Apache-2.0
#include "engine/surface_flux.hpp"

#include "engine/case.hpp"
#include "engine/causes.hpp"
#include "engine/caution.hpp"
#include "engine/number_text.hpp"
#include "engine/profile_csv.hpp"
#include "engine/version.hpp"

#include <cmath>
#include <fmt/format.h>
#include <functional>
#include <limits>
#include <nlohmann/json.hpp>

namespace rille::engine {
namespace {

constexpr double seconds_per_minute = 60;
constexpr double nothing = std::numeric_limits<double>::quiet_NaN();

/// The mechanism with two more tallies of every ion, its flux and the energy that it brings, which
/// no process uses.
fluxes::Mechanism with_probes(fluxes::Mechanism mechanism) {
    for (int ion = 0; ion < static_cast<int>(mechanism.ions.size()); ++ion) {
        mechanism.tallies.push_back({ion, {fluxes::ConstantLaw{1}, fluxes::FlatAngle{}, 1}});
        mechanism.tallies.push_back({ion, {fluxes::LinearLaw{1}, fluxes::FlatAngle{}, 1}});
    }
    return mechanism;
}

using fluxes::IonPath;
using Paths = std::vector<IonPath>;

class Filler {
public:
    Filler(const Case& c, const fluxes::SurfaceStep& step, SurfaceFlux& out)
        : c_(c), step_(step), detail_(*step.detail), out_(out) {}

    void fill() {
        for (std::size_t i = 0; i < c_.mechanism.ions.size(); ++i)
            ion(static_cast<int>(i));
        for (std::size_t k = 0; k < step_.neutral.size(); ++k)
            add("neutral_" + c_.mechanism.neutrals[k], "per_nm2_s", [&, k](int b, std::size_t e) {
                return b < 0 ? step_.neutral[k][e] : detail_.neutral_batch[b][k][e];
            });
        for (const NamedField& field : out_.state.fields)
            if (field.name.rfind("coverage_", 0) == 0)
                out_.columns.push_back({field.name, field.unit, field.value, {}});
        add("rate", "nm_per_min", [&](int b, std::size_t e) {
            return seconds_per_minute * (b < 0 ? step_.response[e].rate : step_.rate_batch[b][e]);
        });
        for (int k = 0; k < fluxes::cause_count; ++k)
            add(std::string("rate_by_") + cause_looks()[k].column, "nm_per_min",
                [&, k](int b, std::size_t e) {
                    return seconds_per_minute *
                           (b < 0 ? step_.cause[k][e] : detail_.cause_batch[b][k][e]);
                });
        const auto supplies = supply_names(c_);
        for (std::size_t s = 0; s < supplies.size(); ++s) {
            out_.columns.push_back(
                {"flux_times_slope_" + supplies[s], "nm_per_min", step_.supply[s], {}});
            for (double& value : out_.columns.back().value)
                value *= seconds_per_minute;
        }
    }

private:
    using Value = std::function<double(int batch, std::size_t element)>;

    void add(const std::string& name, const std::string& unit, const Value& value) {
        const std::size_t n = out_.state.surface.size();
        FluxColumn column{name, unit, std::vector<double>(n), std::vector<double>(n)};
        std::vector<double> batch(fluxes::batches);
        for (std::size_t e = 0; e < n; ++e) {
            column.value[e] = value(-1, e);
            double mean = 0;
            for (int b = 0; b < fluxes::batches; ++b)
                mean += (batch[b] = value(b, e)) / fluxes::batches;
            for (double& one : batch)
                one -= mean;
            column.error[e] = sampling_error(batch);
        }
        out_.columns.push_back(std::move(column));
    }

    /// Sum over paths of the flux (probe 0) or energy (probe 1) of an ion.
    double brought(int ion, int probe, const Paths& paths, int b, std::size_t e) const {
        const int tally = static_cast<int>(c_.mechanism.tallies.size()) + 2 * ion + probe;
        const auto& all = b < 0 ? detail_.by_path : detail_.by_path_batch[b];
        double sum = 0;
        for (const IonPath path : paths)
            sum += all[(e * fluxes::ion_paths + static_cast<int>(path)) * detail_.tallies + tally];
        return sum;
    }
    void flux_and_energy(int ion, const std::string& name, const Paths& paths) {
        add(name, "per_nm2_s", [&](int b, std::size_t e) { return brought(ion, 0, paths, b, e); });
        add(name + "_mean_energy", "eV", [&](int b, std::size_t e) {
            const double flux = brought(ion, 0, paths, b, e);
            return flux > 0 ? brought(ion, 1, paths, b, e) / flux : b < 0 ? nothing : 0.0;
        });
    }
    void ion(int i) {
        const std::string name = "ion_" + c_.mechanism.ions[i];
        flux_and_energy(i, name + "_direct", {IonPath::direct});
        flux_and_energy(i, name + "_reflected",
                        {IonPath::after_one, IonPath::after_two, IonPath::after_more});
        if (!step_.fast_neutral_flux[i].empty())
            flux_and_energy(i, "fast_neutral_of_" + c_.mechanism.ions[i], {IonPath::fast_neutral});
    }

    const Case& c_;
    const fluxes::SurfaceStep& step_;
    const fluxes::SurfaceDetail& detail_;
    SurfaceFlux& out_;
};

/// Means over a part of the surface, weighted by area.
struct PartMean {
    const char* region;
    double area = 0;
    std::vector<double> mean; ///< by column; NaN where it exists nowhere
};

std::vector<PartMean> part_means(const Case& c, const SurfaceFlux& flux) {
    std::vector<PartMean> parts;
    const geometry::Surface& s = flux.state.surface;
    for (const char* region : regions) {
        PartMean part{region, 0, {}};
        std::vector<double> weight(flux.columns.size(), 0.0);
        part.mean.assign(flux.columns.size(), 0.0);
        for (std::size_t e = 0; e < s.size(); ++e) {
            if ((!s.chain.empty() && s.chain[e] != 0) || std::string(region_of(c, s, e)) != region)
                continue;
            part.area += s.area[e];
            for (std::size_t k = 0; k < flux.columns.size(); ++k) {
                const double value = flux.columns[k].value[e];
                if (std::isnan(value)) continue;
                part.mean[k] += s.area[e] * value;
                weight[k] += s.area[e];
            }
        }
        for (std::size_t k = 0; k < weight.size(); ++k)
            part.mean[k] = weight[k] > 0 ? part.mean[k] / weight[k] : nothing;
        if (part.area > 0) parts.push_back(std::move(part));
    }
    return parts;
}

std::string column_title(const FluxColumn& column, const char* error) {
    return column_name(column.name) + error + "_" + column.unit;
}

} // namespace

SurfaceFlux surface_flux(const Case& c, const Simulation& simulation, const std::string& plasma) {
    const Simulation::Examined found = simulation.examine(with_probes(c.mechanism), plasma);
    SurfaceFlux flux;
    flux.plasma = plasma;
    flux.state.time_s = simulation.time_s();
    flux.state.surface = simulation.surface();
    flux.state.grown = simulation.films();
    fill_state(flux.state, c, found.step);
    Filler(c, found.step, flux).fill();
    flux.cause = found.step.cause;
    flux.rays = found.rays;
    flux.lost_rays = found.lost_rays;
    flux.iterations = found.step.iterations;
    flux.residual = found.step.residual;
    return flux;
}

std::string flux_csv(const Case& c, const SurfaceFlux& flux) {
    const SurfaceState& state = flux.state;
    std::string text = place_header(c) + ",region,material,film";
    for (const FluxColumn& column : flux.columns) {
        text += "," + column_title(column, "");
        if (!column.error.empty()) text += "," + column_title(column, "_error");
    }
    text += "\n";
    const std::vector<double> arc =
        c.domain.planar_contour() ? arc_length(state.surface) : std::vector<double>();
    for (std::size_t e = 0; e < state.surface.size(); ++e) {
        text += place_row(c, state.surface, arc, e) + "," + region_of(c, state.surface, e) +
                material_row(c, state, e);
        for (const FluxColumn& column : flux.columns) {
            const bool exists = !std::isnan(column.value[e]);
            text += "," + (exists ? shortest(column.value[e]) : "");
            if (!column.error.empty()) text += "," + (exists ? shortest(column.error[e]) : "");
        }
        text += "\n";
    }
    return text;
}

nlohmann::json flux_json(const Case& c, const SurfaceFlux& flux, const std::string& command) {
    using nlohmann::json;
    json columns = json::array(), parts = json::array();
    for (const FluxColumn& column : flux.columns)
        columns.push_back(column_title(column, ""));
    for (const PartMean& part : part_means(c, flux)) {
        json means = json::object();
        for (std::size_t k = 0; k < part.mean.size(); ++k)
            means[column_title(flux.columns[k], "")] =
                std::isnan(part.mean[k]) ? json() : json(part.mean[k]);
        parts.push_back({{"region", part.region},
                         {c.domain.extruded() ? "length_nm" : "area_nm2", part.area},
                         {"mean", means}});
    }
    const auto standing = [&](fluxes::Standing s) {
        const auto found = c.standing.find(s);
        return found == c.standing.end() ? 0 : found->second;
    };
    return {{"format", 1},
            {"title", c.title},
            {"program",
             {{"name", "rille"},
              {"version", version()},
              {"revision", revision()},
              {"build", build_info()}}},
            {"command", command},
            {"case_file", c.file},
            {"plasma", flux.plasma},
            {"time_s", flux.state.time_s},
            {"seed", c.seed},
            {"parameter_standing",
             {{"measured", standing(fluxes::Standing::measured)},
              {"published", standing(fluxes::Standing::published)},
              {"from_memory", standing(fluxes::Standing::from_memory)},
              {"illustrative", standing(fluxes::Standing::illustrative)}}},
            {"health",
             {{"surface_elements", flux.state.surface.size()},
              {"spacing_nm", c.domain.spacing},
              {"rays", flux.rays},
              {"lost_rays", flux.lost_rays},
              {"iterations", flux.iterations},
              {"largest_change_of_sticking", flux.residual}}},
            {"errors", "95 % sampling error; grid error not assessed"},
            {"quantities", columns},
            {"parts", parts},
            {"warnings", c.warnings},
            {"caution", caution}};
}

std::string flux_table(const Case& c, const SurfaceFlux& flux) {
    const auto parts = part_means(c, flux);
    std::string text = fmt::format("{}, plasma {}: means over the parts of the surface\n  {:<44}",
                                   c.title, flux.plasma, "");
    for (const PartMean& part : parts)
        text += fmt::format("{:>12}", part.region);
    for (std::size_t k = 0; k < flux.columns.size(); ++k) {
        bool any = false;
        for (const PartMean& part : parts)
            any = any || (part.mean[k] != 0 && !std::isnan(part.mean[k]));
        if (!any) continue;
        text += fmt::format("\n  {:<44}", column_title(flux.columns[k], ""));
        for (const PartMean& part : parts)
            text += std::isnan(part.mean[k]) ? fmt::format("{:>12}", "-")
                                             : fmt::format("{:>12.4g}", part.mean[k]);
    }
    return text + "\n";
}

} // namespace rille::engine
