// SPDX-License-Identifier: Apache-2.0
#include "geometry/metrology.hpp"

#include "geometry/section.hpp"

#include <algorithm>
#include <cmath>

namespace rille::geometry {

namespace {

constexpr double degrees = 180.0 / 3.14159265358979323846;

Section along_x(const Domain& domain, const Surface& surface, const FeatureSite& site) {
    return {domain, surface, 0, site.centre_y, site.centre_x, site.width_x};
}

/// An element that moves out by d shifts its crossing of a level by d / n.u.
double level_shift(const Section::Piece& p) {
    return 1.0 / p.normal_u;
}

Measured width_of(const Section::Gap& gap) {
    return {gap.width(),
            {{gap.left.piece->element, -level_shift(*gap.left.piece)},
             {gap.right.piece->element, level_shift(*gap.right.piece)}}};
}

std::optional<Measured> width_at(const Section& section, double z) {
    const auto gap = section.gap_at(z);
    if (!gap) return {};
    return width_of(*gap);
}

/// Heights of all vertices strictly between two heights, with both, sorted.
std::vector<double> heights_between(const Section& section, double low, double high) {
    std::vector<double> z{low, high};
    for (const auto& p : section.pieces())
        for (const double end : {p.z0, p.z1})
            if (end > low && end < high) z.push_back(end);
    std::sort(z.begin(), z.end());
    z.erase(std::unique(z.begin(), z.end()), z.end());
    return z;
}

/// Mean of two readings of the same quantity.
Measured mean_of(const Measured& a, const Measured& b) {
    Measured m{0.5 * (a.value + b.value), {}};
    for (const Measured* part : {&a, &b})
        for (const auto& [element, weight] : part->elements)
            m.elements.emplace_back(element, 0.5 * weight);
    return m;
}

} // namespace

std::optional<Measured> cd_at(const Domain& domain, const Surface& surface, const FeatureSite& site,
                              double z) {
    return width_at(along_x(domain, surface, site), z);
}

std::optional<Lines> lines_at(const Domain& domain, const Surface& surface, const FeatureSite& site,
                              double z) {
    const Section section = along_x(domain, surface, site);
    const auto gap = section.gap_at(z);
    if (!gap) return {};
    const Section::Crossing *before = nullptr, *after = nullptr; // walls of the next gaps
    const std::vector<Section::Crossing> walls = section.level(z);
    for (const Section::Crossing& wall : walls) {
        if (wall.u < gap->left.u && wall.piece != gap->left.piece) before = &wall;
        if (wall.u > gap->right.u && wall.piece != gap->right.piece && !after) after = &wall;
    }
    if (!before || !after) return {};
    const auto solid = [](const Section::Crossing& left, const Section::Crossing& right) {
        return Measured{right.u - left.u,
                        {{left.piece->element, -level_shift(*left.piece)},
                         {right.piece->element, level_shift(*right.piece)}}};
    };
    return Lines{solid(*before, gap->left), solid(gap->right, *after)};
}

std::optional<Measured> cd_y_at(const Domain& domain, const Surface& surface,
                                const FeatureSite& site, double z) {
    if (domain.extruded()) return {};
    return width_at({domain, surface, 1, site.centre_x, site.centre_y, site.width_y}, z);
}

std::optional<Bow> widest_cd(const Domain& domain, const Surface& surface, const FeatureSite& site,
                             double z_low, double z_high) {
    const Section section = along_x(domain, surface, site);
    std::optional<Bow> widest;
    // Between vertices the width is linear, so its maximum lies at a vertex; the highest counts.
    std::vector<double> heights = heights_between(section, z_low, z_high);
    for (auto z = heights.rbegin(); z != heights.rend(); ++z) {
        std::optional<Section::Gap> above, below;
        if (*z < z_high) above = section.gap_at(*z, Section::Side::from_above);
        if (*z > z_low) below = section.gap_at(*z, Section::Side::from_below);
        const double tie = 1e-9 * domain.spacing;
        const double width = std::max(above ? above->width() : 0, below ? below->width() : 0);
        if (width <= (widest ? widest->cd.value + tie : 0)) continue;
        if (above && below && std::fabs(above->width() - below->width()) < tie)
            widest = Bow{mean_of(width_of(*above), width_of(*below)), *z};
        else
            widest = Bow{width_of(above && above->width() == width ? *above : *below), *z};
    }
    return widest;
}

namespace {

/// Least-squares line u(z) through one wall: weighted points, with the element of each.
struct WallFit {
    struct Point {
        double z, u, weight;
        const Section::Piece* piece;
    };
    std::vector<Point> points;

    /// sign +1 for the left wall, -1 for the right one.
    Measured angle(double sign) const {
        double total = 0, mean_z = 0, spread = 0, slope = 0;
        for (const Point& p : points) {
            total += p.weight;
            mean_z += p.weight * p.z;
        }
        mean_z /= total;
        for (const Point& p : points) {
            spread += p.weight * (p.z - mean_z) * (p.z - mean_z);
            slope += p.weight * (p.z - mean_z) * p.u;
        }
        slope /= spread;
        Measured m{90 + sign * degrees * std::atan(slope), {}};
        const double turn = sign * degrees / (1 + slope * slope) / spread;
        for (const Point& p : points) {
            const double weight = turn * p.weight * (p.z - mean_z) * level_shift(*p.piece);
            if (!m.elements.empty() && m.elements.back().first == p.piece->element)
                m.elements.back().second += weight;
            else
                m.elements.emplace_back(p.piece->element, weight);
        }
        return m;
    }
};

} // namespace

std::optional<SidewallAngles> sidewall_angles(const Domain& domain, const Surface& surface,
                                              const FeatureSite& site, double z_low,
                                              double z_high) {
    if (!(z_high > z_low)) return {};
    const Section section = along_x(domain, surface, site);
    const std::vector<double> heights = heights_between(section, z_low, z_high);
    WallFit left, right;
    for (std::size_t i = 1; i < heights.size(); ++i) {
        // Two-point Gauss: exact for the products of two linear functions that the fit integrates.
        const double middle = 0.5 * (heights[i] + heights[i - 1]);
        const double half = 0.5 * (heights[i] - heights[i - 1]);
        for (const double at : {-1 / std::sqrt(3.0), 1 / std::sqrt(3.0)}) {
            const double z = middle + at * half;
            const auto gap = section.gap_at(z);
            if (!gap) return {};
            left.points.push_back({z, gap->left.u, half, gap->left.piece});
            right.points.push_back({z, gap->right.u, half, gap->right.piece});
        }
    }
    return SidewallAngles{left.angle(1), right.angle(-1)};
}

namespace {

/// The floor of one feature: its lowest points over ranges of u, seen from below the opening.
class FloorReader {
public:
    FloorReader(const Section& section, double z_from, double left, double right)
        : section_(section), z_from_(z_from), left_(left), right_(right) {}

    /// Lowest point for left + from * width <= u <= left + to * width.
    std::optional<Section::Crossing> lowest(double from, double to) const {
        const double width = right_ - left_;
        const double low = left_ + from * width, high = left_ + to * width;
        std::optional<Section::Crossing> best;
        offer(low, 1, best);
        offer(high, -1, best);
        for (const auto& p : section_.pieces())
            for (const double sense : {-1.0, 1.0})
                if (p.z0 <= z_from_ && p.u0 > low && p.u0 < high) offer(p.u0, sense, best);
        return best;
    }

private:
    /// The floor at u, approached from beside it (a step has two heights there).
    void offer(double u, double sense, std::optional<Section::Crossing>& best) const {
        auto found = section_.floor_below(u + sense * 1e-9 * (right_ - left_), z_from_);
        if (!found) return;
        const Section::Piece& p = *found->piece;
        found->u = u;
        found->z = p.z0 + (u - p.u0) / (p.u1 - p.u0) * (p.z1 - p.z0);
        if (!best || found->z < best->z) best = found;
    }

    const Section& section_;
    double z_from_, left_, right_;
};

/// An element that moves out by d lifts its crossing of an upright line by d / n.z.
Measured height_of(const Section::Crossing& c) {
    return {c.z, {{c.piece->element, 1.0 / c.piece->normal_z}}};
}

} // namespace

std::optional<Floor> floor_of(const Domain& domain, const Surface& surface,
                              const FeatureSite& site) {
    const Section section = along_x(domain, surface, site);
    const double sky = 1e300;
    const auto centre = section.floor_below(section.centre(), sky);
    if (!centre || centre->piece->chain != 0) return {};
    for (auto below = centre; below;) { // a void under the axis: the feature has closed
        below = section.floor_below(section.centre(), std::nextafter(below->z, -sky));
        if (below && below->piece->chain != 0) return {};
    }
    Floor floor{height_of(*centre), height_of(*centre), height_of(*centre), height_of(*centre)};
    const double rise = std::max(0.1 * std::max(0.0, -centre->z), 0.5 * domain.spacing);
    const auto bottom = section.gap_at(centre->z + rise);
    double left = section.centre() - 0.5 * section.width();
    double right = section.centre() + 0.5 * section.width();
    double z_from = sky;
    if (bottom && bottom->left.u < section.centre() && bottom->right.u > section.centre()) {
        left = bottom->left.u;
        right = bottom->right.u;
        z_from = centre->z + rise;
    }
    if (right <= left) return floor;
    const FloorReader reader(section, z_from, left, right);
    if (const auto edge = reader.lowest(0, 0.1)) floor.left_edge = height_of(*edge);
    if (const auto edge = reader.lowest(0.9, 1)) floor.right_edge = height_of(*edge);
    if (const auto deepest = reader.lowest(0, 1); deepest && deepest->z < centre->z)
        floor.deepest = height_of(*deepest);
    return floor;
}

std::optional<Measured> top_between(const Domain& domain, const Surface& surface, double x_low,
                                    double x_high, double y) {
    const Section section(domain, surface, 0, y, 0.5 * (x_low + x_high), x_high - x_low);
    std::optional<Section::Crossing> best;
    const auto offer = [&](double u, double z, const Section::Piece& p) {
        if (u < x_low || u > x_high || p.u1 <= p.u0) return;
        if (!best || z > best->z) best = Section::Crossing{u, z, &p};
    };
    for (const auto& p : section.pieces()) {
        offer(p.u0, p.z0, p);
        offer(p.u1, p.z1, p);
        for (const double u : {x_low, x_high})
            if ((p.u0 > u) != (p.u1 > u))
                offer(u, p.z0 + (u - p.u0) / (p.u1 - p.u0) * (p.z1 - p.z0), p);
    }
    if (!best) return {};
    return height_of(*best);
}

namespace {

/// Facet pieces of one side of the opening: the angle's mean and how displacements turn it.
struct Facet {
    std::vector<const Section::Piece*> pieces;
    double length = 0, angle_times_length = 0;

    void add(const Section::Piece& p, double angle) {
        const double piece = std::hypot(p.u1 - p.u0, p.z1 - p.z0);
        pieces.push_back(&p);
        length += piece;
        angle_times_length += piece * angle;
    }
    /// The facet as one line whose pieces move out by d: it turns by the slope of d along the walk.
    void add_weights(double share, bool left, Measured& m) const {
        std::vector<double> at, size;
        double mean = 0, spread = 0;
        // Place along the walk: the projection on the direction of one piece.
        const double du = pieces.back()->u1 - pieces.back()->u0;
        const double dz = pieces.back()->z1 - pieces.back()->z0;
        const double unit = std::hypot(du, dz);
        for (const auto* p : pieces) {
            at.push_back((0.5 * (p->u0 + p->u1) * du + 0.5 * (p->z0 + p->z1) * dz) / unit);
            size.push_back(std::hypot(p->u1 - p->u0, p->z1 - p->z0));
            mean += size.back() * at.back();
        }
        mean /= length;
        for (std::size_t i = 0; i < pieces.size(); ++i)
            spread += size[i] * ((at[i] - mean) * (at[i] - mean) + size[i] * size[i] / 12);
        for (std::size_t i = 0; i < pieces.size(); ++i)
            m.elements.emplace_back(pieces[i]->element, (left ? -1 : 1) * degrees * share *
                                                            size[i] * (at[i] - mean) / spread);
    }
};

} // namespace

std::optional<Measured> mask_facet_angle(const Domain& domain, const Surface& surface,
                                         const FeatureSite& site, double z_mask_bottom) {
    const Section section = along_x(domain, surface, site);
    const double foot = z_mask_bottom + 1e-3 * domain.spacing;
    const auto gap = section.gap_at(foot);
    if (!gap) return {};
    // The mask beside the opening reaches to where the next opening begins.
    double far_left = -1e300, far_right = 1e300;
    for (const auto& c : section.level(foot)) {
        if (c.u < gap->left.u) far_left = std::max(far_left, c.u);
        if (c.u > gap->right.u) far_right = std::min(far_right, c.u);
    }
    Facet left, right;
    for (const auto& p : section.pieces()) {
        const double angle = degrees * std::acos(std::clamp(p.normal_z, -1.0, 1.0));
        const double u = 0.5 * (p.u0 + p.u1);
        if (0.5 * (p.z0 + p.z1) <= foot || angle < 20 || angle > 80) continue;
        if (p.normal_u > 0 && u > far_left && u < section.centre()) left.add(p, angle);
        if (p.normal_u < 0 && u < far_right && u > section.centre()) right.add(p, angle);
    }
    const double length = left.length + right.length;
    if (length <= 0) return {};
    Measured m{(left.angle_times_length + right.angle_times_length) / length, {}};
    if (left.length > 0) left.add_weights(left.length / length, true, m);
    if (right.length > 0) right.add_weights(right.length / length, false, m);
    return m;
}

} // namespace rille::geometry
