// SPDX-License-Identifier: Apache-2.0
#include "fluxes/aim.hpp"

#include <tbb/parallel_for.h>

#include <algorithm>
#include <array>
#include <cmath>

namespace rille::fluxes {
namespace {

constexpr int level_count = 24;
constexpr std::array<std::array<int, 2>, 4> steps{{{1, 0}, {-1, 0}, {0, 1}, {0, -1}}};

int floor_div(int a, int b) {
    return a >= 0 ? a / b : -((b - 1 - a) / b);
}

} // namespace

OpeningAims::OpeningAims(const geometry::Domain& domain, const geometry::RayCaster& caster)
    : domain_(domain) {
    read_heights(caster);
    const auto [low, high] = std::minmax_element(height_.begin(), height_.end());
    if (*high - *low < domain_.spacing) return;
    // Close together near the top, where the rim of an opening is.
    for (int l = 0; l < level_count; ++l) {
        const double share = (l + 0.5) / level_count;
        Level level;
        level.z = *high - (*high - *low) * share * share;
        flood(level);
        levels_.push_back(std::move(level));
    }
}

void OpeningAims::read_heights(const geometry::RayCaster& caster) {
    const int nx = domain_.cells_x, ny = domain_.cells_y;
    height_.resize(std::size_t(nx) * ny);
    tbb::parallel_for(0, ny, [&](int j) {
        for (int i = 0; i < nx; ++i) {
            geometry::Vec3 start = domain_.node(i, j, 0);
            start.z = caster.z_open() - 1e-6 * domain_.spacing;
            const auto hit = caster.trace(start, {0, 0, -1}, -1);
            height_[std::size_t(j) * nx + i] =
                hit.kind == geometry::Hit::Kind::surface ? hit.point.z : start.z;
        }
    });
}

void OpeningAims::flood(Level& level) const {
    const int nx = domain_.cells_x, ny = domain_.cells_y;
    level.cells.resize(height_.size());
    std::vector<int> everything;
    for (int seed = 0; seed < nx * ny; ++seed) {
        if (height_[seed] >= level.z || level.cells[seed].opening >= 0) continue;
        const int id = static_cast<int>(level.openings.size());
        level.cells[seed] = {id, 0, 0};
        std::vector<int> queue{seed};
        int i0 = seed % nx, i1 = i0, j0 = seed / nx, j1 = j0;
        for (std::size_t q = 0; q < queue.size(); ++q) {
            const Cell from = level.cells[queue[q]];
            const int i = queue[q] % nx + from.di * nx, j = queue[q] / nx + from.dj * ny;
            i0 = std::min(i0, i), i1 = std::max(i1, i), j0 = std::min(j0, j), j1 = std::max(j1, j);
            for (const auto& step : steps) {
                const int a = i + step[0], b = j + step[1];
                const int di = floor_div(a, nx), dj = floor_div(b, ny);
                if (domain_.sides == geometry::Sides::mirror && (di || dj)) continue;
                const int next = (b - dj * ny) * nx + (a - di * nx);
                if (height_[next] >= level.z || level.cells[next].opening >= 0) continue;
                level.cells[next] = {id, di, dj};
                queue.push_back(next);
            }
        }
        const double h = domain_.spacing;
        Aim aim{domain_.x_min() + i0 * h, domain_.x_min() + (i1 + 1) * h, domain_.y_min() + j0 * h,
                domain_.y_min() + (j1 + 1) * h, level.z};
        aim.x0 -= 0.5 * h, aim.x1 += 0.5 * h, aim.y0 -= 0.5 * h, aim.y1 += 0.5 * h;
        if (domain_.revolved())
            aim = {-aim.x1, aim.x1, -aim.x1, aim.x1, aim.z};
        else
            widen_at_mirrors(aim);
        level.openings.push_back(aim);
        everything.insert(everything.end(), queue.begin(), queue.end());
    }
    spread(level, everything);
}

void OpeningAims::spread(Level& level, std::vector<int>& front) const {
    const int nx = domain_.cells_x, ny = domain_.cells_y;
    for (std::size_t q = 0; q < front.size(); ++q) {
        const Cell from = level.cells[front[q]];
        const int i = front[q] % nx, j = front[q] / nx;
        for (const auto& step : steps) {
            const int a = i + step[0], b = j + step[1];
            const int di = floor_div(a, nx), dj = floor_div(b, ny);
            if (domain_.sides == geometry::Sides::mirror && (di || dj)) continue;
            const int next = (b - dj * ny) * nx + (a - di * nx);
            if (level.cells[next].opening >= 0) continue;
            level.cells[next] = {from.opening, from.di + di, from.dj + dj};
            front.push_back(next);
        }
    }
}

void OpeningAims::widen_at_mirrors(Aim& aim) const {
    if (domain_.sides != geometry::Sides::mirror) return;
    const auto widen = [](double& low, double& high, double side_low, double width) {
        const double side_high = side_low + width;
        const double mirrored = low <= side_low ? 2 * side_low - high : low;
        if (high >= side_high) high = 2 * side_high - low;
        low = mirrored;
    };
    widen(aim.x0, aim.x1, domain_.x_min(), domain_.width_x());
    widen(aim.y0, aim.y1, domain_.y_min(), domain_.width_y());
}

std::vector<Aim> OpeningAims::from(const geometry::Vec3& p) const {
    const int nx = domain_.cells_x, ny = domain_.cells_y;
    const double h = domain_.spacing;
    const int i = std::clamp(int(std::floor((p.x - domain_.x_min()) / h)), 0, nx - 1);
    const int j = std::clamp(int(std::floor((p.y - domain_.y_min()) / h)), 0, ny - 1);
    std::vector<Aim> aims;
    std::vector<double> size; // area over height squared
    for (const Level& level : levels_) {
        const double up = level.z - p.z;
        if (up < h) break;
        const Cell cell = level.cells[std::size_t(j) * nx + i];
        if (cell.opening < 0) continue;
        Aim aim = level.openings[cell.opening];
        const double own = aim.area() / (up * up);
        if (own >= 1) continue; // the cosine law does as well
        // The opening's frame is di, dj periods away from the frame of the cell.
        aim.x0 -= cell.di * domain_.width_x(), aim.x1 -= cell.di * domain_.width_x();
        aim.y0 -= cell.dj * domain_.width_y(), aim.y1 -= cell.dj * domain_.width_y();
        // Narrower than what is seen above: that is then no longer the narrowest.
        while (!size.empty() && own < size.back())
            aims.pop_back(), size.pop_back();
        if (!size.empty() && own < widening * size.back()) continue;
        aims.push_back(aim);
        size.push_back(own);
    }
    return aims;
}

} // namespace rille::fluxes
