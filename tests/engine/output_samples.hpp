// SPDX-License-Identifier: Apache-2.0
// Invented cases and profiles for tests of what a run writes.
#pragma once

#include "engine/case.hpp"
#include "engine/run_result.hpp"
#include "tests/support/shapes.hpp"

#include <cmath>
#include <filesystem>
#include <limits>
#include <string>
#include <unistd.h>
#include <vector>

namespace rille::tests {

using engine::Case;
using engine::SurfaceState;

/// A folder of its own below the system's temporary one, removed at the end.
class ScratchFolder {
public:
    ScratchFolder() {
        std::string name = (std::filesystem::temp_directory_path() / "rille-test-XXXXXX").string();
        if (!mkdtemp(name.data())) throw std::runtime_error("no scratch folder");
        path_ = name;
    }
    ~ScratchFolder() {
        std::error_code ignored;
        std::filesystem::remove_all(path_, ignored);
    }
    std::string operator/(const std::string& name) const { return path_ + "/" + name; }
    const std::string& path() const { return path_; }

private:
    std::string path_;
};

/// A 60 nm trench through 180 nm of resist into silicon on an oxide stop, pitch 160 nm.
inline Case trench_case() {
    Case c;
    c.title = "60 nm gate trench, chlorine main etch";
    c.file = "trench.yaml";
    c.domain.spacing = 2;
    c.domain.cells_x = 80;
    c.materials = {"resist", "Si", "SiO2", "polymer"};
    const double deep = -std::numeric_limits<double>::infinity();
    c.films = {{"mask", 0, 180, 0},
               {"gate", 1, 0, -240},
               {"stop", 2, -240, -252},
               {"bulk", 1, -252, deep}};
    c.substrate_first = 1;
    c.mask.thickness = 180;
    geometry::Opening opening;
    opening.name = "trench";
    opening.width_x = 60;
    c.mask.openings = {opening};
    c.mask_material = "resist";
    c.chemistry = "silicon-cl2-ar";
    c.mechanism.ions = {"Cl2+"};
    c.mechanism.neutrals = {"Cl"};
    c.cd_places = {{"top", {"10 nm below gate top", -10}},
                   {"middle", {"middle of gate", -120}},
                   {"bottom", {"10 nm above stop", -230}}};
    c.standing = {{fluxes::Standing::published, 14},
                  {fluxes::Standing::from_memory, 5},
                  {fluxes::Standing::illustrative, 2}};
    c.resolved_yaml = "format: 1\ntitle: 60 nm gate trench\n";
    engine::RecipeStep main, over;
    main.name = "main";
    over.name = "over";
    c.steps = {main, over};
    return c;
}

/// Etched trench at `share` of the way: faceted mask, bowed and slightly tapered wall, micro-
/// trenches at the foot. Symmetric about x = 0.
inline geometry::Surface etched_trench(const geometry::Domain& domain, double share) {
    const double mask = 180 - 95 * share, depth = 246 * share, side = 0.5 * domain.width_x();
    std::vector<Vec3> left = {{-side, 0, mask}};
    left.push_back({-40 - 4 * share, 0, mask});
    left.push_back({-30 - 5 * share, 0, std::fmax(4.0, mask - 40 * share)});
    left.push_back({-30 - 2 * share, 0, 0});
    for (int i = 1; i <= 12; ++i) {
        const double t = i / 12.0;
        const double bow = 4.5 * share * std::exp(-std::pow((t - 0.3) / 0.18, 2));
        left.push_back({-31 - bow + 4 * t * share, 0, -depth * t});
    }
    left.push_back({-20, 0, -depth - 4 * share});
    left.push_back({-13, 0, -depth + 1});
    std::vector<Vec3> points = left;
    for (auto p = left.rbegin(); p != left.rend(); ++p)
        points.push_back({-p->x, 0, p->z});
    return polyline(domain, points, 2.0);
}

/// A full description of that surface, with 8 batches of displacement of about 0.3 nm.
inline SurfaceState trench_state(const Case& c, double share, double time_s) {
    SurfaceState state;
    state.time_s = time_s;
    state.step = share < 0.9 ? "main" : "over";
    state.surface = etched_trench(c.domain, share);
    const std::size_t n = state.surface.size();
    state.grown.material = {3};
    state.grown.thickness.assign(1, std::vector<double>(n, 0.0));
    for (std::size_t e = 0; e < n; ++e) {
        const Vec3 p = state.surface.centre[e];
        const bool wall = std::fabs(state.surface.normal[e].x) > 0.9;
        if (wall && p.z < 0) state.grown.thickness[0][e] = 1.5 * share;
        state.film.push_back(p.z > 0 ? 0 : p.z > -240 ? 1 : p.z > -252 ? 2 : 3);
        state.material.push_back(wall && p.z < 0 ? 3 : c.films[state.film.back()].material);
        state.rate.push_back(wall ? 0.01 : 4.1);
    }
    state.fields = {{"ion_flux_Cl2+", "per_nm2_s", std::vector<double>(n, 67.3)},
                    {"coverage_Cl", "1", std::vector<double>(n, 0.71)}};
    for (int b = 0; b < 8; ++b) {
        state.displacement.emplace_back(n);
        for (std::size_t e = 0; e < n; ++e)
            state.displacement.back()[e] = 0.3 * std::sin(1.7 * b + 0.9) * share;
    }
    return state;
}

} // namespace rille::tests
