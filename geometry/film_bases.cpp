// SPDX-License-Identifier: Apache-2.0
#include "geometry/film_bases.hpp"

#include "geometry/band.hpp"
#include "geometry/band_topology.hpp"
#include "geometry/check.hpp"

#include <algorithm>
#include <cmath>

namespace rille::geometry {

namespace {

constexpr double known = 4;       ///< [cells] distances are kept up to here
constexpr double trusted = 3.25;  ///< [cells] a larger one says no more than that it is larger
constexpr double thick = 1.5;     ///< [cells] thicker films are read off their bases
constexpr double tolerance = 0.5; ///< [cells] what was carried of thinner ones may be off by
constexpr double deep = 2.5;      ///< [cells] a base is not touched farther inside the front

/// Gives films deepest to last, together `before` thick at element e, the thickness `now`.
void share_out(GrownFilms& films, int deepest, int last, std::size_t e, double before, double now) {
    for (int f = deepest; f <= last; ++f) {
        double& thickness = films.thickness[f][e];
        if (deepest == last)
            thickness = now;
        else
            thickness = before > 0 ? thickness * (now / before) : f == deepest ? now : 0.0;
    }
}

} // namespace

FilmBases::FilmBases(const Domain& domain,
                     const std::vector<std::function<double(const Vec3&)>>& below, double z_low,
                     double z_high, std::vector<char> mixed)
    : domain_(domain), reach_(static_cast<float>(known * domain.spacing)),
      mixed_(std::move(mixed)) {
    const int k_low = static_cast<int>(std::floor((z_low - reach_) / domain.spacing)) - 1;
    const int k_high = static_cast<int>(std::ceil((z_high + reach_) / domain.spacing)) + 1;
    for (const auto& distance : below) {
        Grid grid;
        grid.k_low = k_low;
        for (int k = k_low; k <= k_high; ++k) {
            std::vector<float> layer;
            for (int j = 0; j < domain.cells_y; ++j)
                for (int i = 0; i < domain.cells_x; ++i)
                    layer.push_back(std::clamp(static_cast<float>(distance(domain.node(i, j, k))),
                                               -reach_, reach_));
            grid.layers.push_back(std::move(layer));
        }
        grids_.push_back(std::move(grid));
    }
}

double FilmBases::value(const Grid& grid, int i, int j, int k) const {
    if (k < grid.k_low) return -reach_;
    const std::size_t layer = k - grid.k_low;
    return layer < grid.layers.size() ? grid.layers[layer][j * domain_.cells_x + i] : reach_;
}

/// Below the layers there is solid, above them gas.
float& FilmBases::slot(Grid& grid, int i, int j, int k) {
    const std::size_t size = static_cast<std::size_t>(domain_.cells_x) * domain_.cells_y;
    for (; k < grid.k_low; --grid.k_low)
        grid.layers.emplace_front(size, -reach_);
    while (k - grid.k_low >= static_cast<int>(grid.layers.size()))
        grid.layers.emplace_back(size, reach_);
    return grid.layers[k - grid.k_low][j * domain_.cells_x + i];
}

void FilmBases::follow(const Front& front) {
    const Band& band = front.band();
    for (Grid& grid : grids_)
        for (std::size_t c = 0; c < band.size(); ++c) {
            if (band.phi[c] < -deep * domain_.spacing) continue;
            const Band::Cell& cell = band.cells[c];
            const float phi = std::min(static_cast<float>(band.phi[c]), reach_);
            if (phi <= value(grid, cell.i, cell.j, cell.k)) continue;
            slot(grid, cell.i, cell.j, cell.k) = phi;
        }
}

double FilmBases::distance(int film, const Vec3& p) const {
    const Grid& grid = grids_[film];
    const double u[3] = {(p.x - domain_.x_min()) / domain_.spacing - 0.5,
                         domain_.planar_contour() ? 0.0
                                                  : (p.y - domain_.y_min()) / domain_.spacing - 0.5,
                         p.z / domain_.spacing - 0.5};
    int low[3];
    double part[3];
    for (int a = 0; a < 3; ++a) {
        low[a] = static_cast<int>(std::floor(u[a]));
        part[a] = u[a] - low[a];
    }
    double sum = 0;
    for (int corner = 0; corner < 8; ++corner) {
        double weight = 1;
        for (int a = 0; a < 3; ++a)
            weight *= (corner >> a & 1) ? part[a] : 1 - part[a];
        if (weight == 0) continue;
        const int i = fold_index(low[0] + (corner & 1), domain_.cells_x, domain_.sides);
        const int j = domain_.planar_contour()
                          ? 0
                          : fold_index(low[1] + (corner >> 1 & 1), domain_.cells_y, domain_.sides);
        sum += weight * value(grid, i, j, low[2] + (corner >> 2 & 1));
    }
    return sum;
}

/// Thickness of film f and all above it at a point of the front [nm]. Where the front lies on the
/// base both are interpolated alike, and the difference is 0; where a film covers the base at a
/// sharp edge of the front only the base's value is good.
double FilmBases::thickness_at(int film, const Vec3& p, double own) const {
    const double base = distance(film, p);
    const double covered = std::clamp(2 * (base - own) / domain_.spacing, 0.0, 1.0);
    return std::max(0.0, base - own * (1 - covered));
}

int FilmBases::settle(const Front& front, const Surface& surface, GrownFilms& films) const {
    RILLE_CHECK(films.thickness.size() == grids_.size(), "a base for each grown film");
    const double h = domain_.spacing;
    int changed = 0;
    for (std::size_t e = 0; e < surface.size(); ++e) {
        const double own = front.distance(surface.centre[e]);
        double above = 0, carried_above = 0; // thickness of the films on top of film f
        for (int f = static_cast<int>(grids_.size()) - 1; f >= 0; --f) {
            const int last = f;
            double thickness = films.thickness[f][e];
            for (; f > 0 && mixes(f); --f)
                thickness += films.thickness[f - 1][e];
            const double carried = carried_above + thickness;
            const double found = thickness_at(f, surface.centre[e], own);
            const bool beyond = found > trusted * h && carried > trusted * h;
            const bool off = !beyond && (std::max(found, carried) > thick * h ||
                                         std::fabs(found - carried) > tolerance * h);
            const double total = std::max(above, off ? found : carried);
            if (off || above != carried_above) {
                share_out(films, f, last, e, thickness, total - above);
                ++changed;
            }
            above = total;
            carried_above = carried;
        }
    }
    return changed;
}

std::size_t FilmBases::memory_bytes() const {
    std::size_t bytes = 0;
    for (const Grid& grid : grids_)
        bytes += grid.layers.size() * domain_.cells_x * domain_.cells_y * sizeof(float);
    return bytes;
}

} // namespace rille::geometry
