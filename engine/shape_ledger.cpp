// SPDX-License-Identifier: Apache-2.0
#include "engine/shape_ledger.hpp"

#include "engine/case.hpp"
#include "engine/metrics.hpp"

#include <algorithm>
#include <cmath>

namespace rille::engine {
namespace {

using geometry::Domain;
using geometry::Vec3;

constexpr double pi = 3.14159265358979323846;
constexpr double at_45_deg = 0.70710678118654752, at_65_deg = 0.42261826174069944; // cosines
constexpr std::size_t foot_places = 5; // fluxes are averaged over as much, which rounds the foot
enum FaceIndex : std::size_t { left_or_all, right_wall, floor_face, faces_each };

/// Calls body(place, middle, share) for every place of length h, counted from `origin`, that part
/// of [low, high] lies in.
template <class Body>
void over_places(double low, double high, double origin, double h, const Body& body) {
    const double length = high - low;
    if (!(length > 1e-9 * h)) return;
    const int last = static_cast<int>(std::floor((high - origin) / h));
    for (int i = std::max(0, static_cast<int>(std::floor((low - origin) / h))); i <= last; ++i) {
        const double from = std::max(low, origin + i * h);
        const double to = std::min(high, origin + (i + 1) * h);
        if (to > from) body(static_cast<std::size_t>(i), 0.5 * (from + to), (to - from) / length);
    }
}

struct Extent {
    double low = HUGE_VAL, high = -HUGE_VAL;
    void add(double value) {
        low = std::min(low, value);
        high = std::max(high, value);
    }
};

/// x of a place in the frame of an axis at `centre`, and whether that frame is a mirror image:
/// from the nearest image of the axis.
struct Offset {
    double value = 0;
    bool mirrored = false;
};
Offset offset_from(double x, double centre, double period, geometry::Sides sides) {
    Offset nearest{x - centre, false};
    const auto offer = [&](double value, bool mirrored) {
        if (std::fabs(value) < std::fabs(nearest.value)) nearest = {value, mirrored};
    };
    for (const double side : {-period, period}) {
        if (sides == geometry::Sides::periodic)
            offer(x - centre - side, false);
        else
            offer(side - centre - x, true);
    }
    return nearest;
}

} // namespace

double ShapePart::unexplained_nm(const Place& p) const {
    double sum = 0;
    for (int k = 0; k < fluxes::cause_count; ++k)
        sum += p.removed[k];
    return moved_nm(p) - sum;
}

ShapeLedger::ShapeLedger(const Case& c)
    : domain_(c.fold.whole(c.domain)), fold_(c.fold), origin_(c.fold.origin(c.domain)),
      sites_(feature_sites(c)),
      amounts_(fluxes::cause_count + fluxes::ion_paths + c.mechanism.neutrals.size()),
      since_(faces_each * sites_.size()), start_(since_), now_(since_), removed_(since_.size()) {
    for (geometry::FeatureSite& site : sites_) {
        site.centre_x += origin_.x;
        site.centre_y += origin_.y;
    }
    const double h = domain_.spacing;
    const double highest = c.start ? c.start->high : c.mask.thickness + c.liner_thickness;
    top_ = h * (std::ceil(highest / h) + 4);
    first_ = domain_.revolved() ? 0 : -h * std::ceil(domain_.width_x() / h);
    floor_below_ = c.liner_thickness + 0.5 * h;
}

ShapeLedger::Spot ShapeLedger::spot(const Vec3& at, const Vec3& normal) const {
    if (domain_.revolved()) return {0, at.x, normal.x};
    Spot best;
    double least = HUGE_VAL;
    for (std::size_t s = 0; s < sites_.size(); ++s) {
        const auto& site = sites_[s];
        const Offset x = offset_from(at.x, site.centre_x, domain_.width_x(), domain_.sides);
        const double n_x = x.mirrored ? -normal.x : normal.x;
        double across = x.value, outward = n_x, beyond = std::fabs(x.value) - 0.5 * site.width_x;
        if (site.round) {
            const Offset y = offset_from(at.y, site.centre_y, domain_.width_y(), domain_.sides);
            across = std::hypot(x.value, y.value);
            const double n_y = y.mirrored ? -normal.y : normal.y;
            outward = across > 0 ? (x.value * n_x + y.value * n_y) / across : 0;
            beyond = across - 0.25 * (site.width_x + site.width_y);
        }
        if (beyond < least) {
            least = beyond;
            best = {s, across, outward};
        }
    }
    return best;
}

ShapeLedger::Patch ShapeLedger::patch(const geometry::Surface& surface, std::size_t element,
                                      int copy) const {
    const auto moved = [&](const Vec3& p) { return fold_.image(copy, p + origin_); };
    Patch patch{moved(surface.centre[element]),
                fold_.image(copy, surface.normal[element]),
                {},
                surface.area[element]};
    for (const int corner : surface.corners[element])
        if (corner >= 0) patch.corners.push_back(moved(surface.vertices[corner]));
    return patch;
}

void ShapeLedger::put_wall(const Patch& patch, const Spot& here, const std::vector<double>& rates,
                           Readings& readings) const {
    const Vec3 normal = patch.normal, centre = patch.centre;
    const double sideways = std::hypot(normal.x, normal.y);
    Extent heights;
    for (const Vec3& corner : patch.corners)
        heights.add(corner.z);
    const bool planar = domain_.planar_contour(), round = sites_[here.opening].round;
    const double size =
        planar ? heights.high - heights.low : patch.area * sideways; // seen sideways
    auto& places =
        readings[faces_each * here.opening + (round || here.across < 0 ? left_or_all : right_wall)];
    over_places(-heights.high, -heights.low, -top_, domain_.spacing,
                [&](std::size_t place, double depth, double share) {
                    const double rise = -depth - centre.z;
                    const double lean = planar ? -rise * normal.z / here.outward : 0;
                    if (places.size() <= place) places.resize(place + 1);
                    places[place].add(share * size, std::fabs(here.across + lean),
                                      std::fabs(normal.z), rates, sideways);
                });
}

void ShapeLedger::put_floor(const Patch& patch, const Spot& here, const std::vector<double>& rates,
                            Readings& readings) const {
    const Vec3 normal = patch.normal, centre = patch.centre;
    Extent across;
    for (const Vec3& corner : patch.corners)
        across.add(spot(corner, normal).across);
    const bool planar = domain_.planar_contour();
    const double size =
        planar ? across.high - across.low : patch.area * normal.z; // seen from above
    auto& places = readings[faces_each * here.opening + floor_face];
    over_places(across.low, across.high, first_, domain_.spacing,
                [&](std::size_t place, double middle, double share) {
                    const double lean =
                        planar ? -(middle - here.across) * here.outward / normal.z : 0;
                    if (places.size() <= place) places.resize(place + 1);
                    places[place].add(share * size, centre.z + lean, std::hypot(normal.x, normal.y),
                                      rates, normal.z);
                });
}

void ShapeLedger::put(const Patch& patch, const std::vector<double>& rates,
                      Readings& readings) const {
    const Vec3 normal = patch.normal;
    const Spot here = spot(patch.centre, normal);
    // The gas of an opening lies on the side of its axis.
    const bool faces_axis = (sites_[here.opening].round ? 1 : here.across) * here.outward < 0;
    if (std::hypot(normal.x, normal.y) >= at_45_deg && faces_axis)
        put_wall(patch, here, rates, readings);
    if (normal.z >= at_65_deg && patch.centre.z <= floor_below_)
        put_floor(patch, here, rates, readings);
}

ShapeLedger::Readings ShapeLedger::read(const geometry::Surface& surface,
                                        const fluxes::CauseFields& cause,
                                        const fluxes::CauseFields& supply) const {
    Readings readings(faces_each * sites_.size());
    if (sites_.empty()) return readings;
    std::vector<double> rates(cause.size() + supply.size());
    for (std::size_t e = 0; e < surface.size(); ++e) {
        if (surface.chain[e] != 0) continue;
        for (std::size_t k = 0; k < rates.size(); ++k)
            rates[k] = k < cause.size() ? cause[k][e] : supply[k - cause.size()][e];
        for (int copy = 0; copy < fold_.copies(); ++copy)
            put(patch(surface, e, copy), rates, readings);
    }
    for (auto& face : readings)
        for (Reading& reading : face) {
            if (!(reading.weight > 0)) continue;
            reading.position /= reading.weight;
            reading.lean /= reading.weight;
            for (double& speed : reading.speed)
                speed /= reading.weight;
        }
    return readings;
}

void ShapeLedger::Reading::add(double size, double at, double leans,
                               const std::vector<double>& rates, double facing) {
    weight += size;
    position += size * at;
    lean += size * leans;
    speed.resize(rates.size(), 0);
    for (std::size_t k = 0; k < rates.size(); ++k)
        speed[k] += size * rates[k] / facing;
}

bool ShapeLedger::stands(std::size_t face, std::size_t place, const Reading& reading) const {
    const double h = domain_.spacing;
    double breadth = 1;
    if (!domain_.planar_contour()) {
        const double radius =
            face % faces_each == floor_face ? first_ + (double(place) + 0.5) * h : reading.position;
        breadth = sites_[face / faces_each].round ? 2 * pi * std::fabs(radius) : domain_.width_y();
    }
    return reading.weight >= 0.5 * h * breadth;
}

bool ShapeLedger::begins(std::size_t face, std::size_t place,
                         const std::vector<Reading>& readings) const {
    if (face % faces_each == floor_face) return readings[place].lean <= at_45_deg;
    if (place + foot_places >= readings.size()) return false;
    for (std::size_t p = place; p <= place + foot_places; ++p)
        if (!stands(face, p, readings[p]) || readings[p].lean > at_65_deg) return false;
    return true;
}

void ShapeLedger::add(double dt_s, const Readings& at_start, const Readings& at_end) {
    for (std::size_t f = 0; f < since_.size(); ++f)
        for (std::size_t p = 0; p < since_[f].size(); ++p) {
            if (since_[f][p] < 0 || p >= at_start[f].size()) continue;
            const Reading& first = at_start[f][p];
            const Reading& last =
                p < at_end[f].size() && stands(f, p, at_end[f][p]) ? at_end[f][p] : first;
            for (std::size_t k = 0; k < first.speed.size(); ++k)
                removed_[f][p][k] += 0.5 * dt_s * (first.speed[k] + last.speed[k]);
        }
}

void ShapeLedger::stand(double time_s, const geometry::Surface& surface) {
    const Readings readings = read(surface, {}, {});
    for (std::size_t f = 0; f < since_.size(); ++f) {
        const std::size_t places = std::max(since_[f].size(), readings[f].size());
        since_[f].resize(places, -1);
        start_[f].resize(places, 0);
        now_[f].resize(places, 0);
        removed_[f].resize(places);
        for (std::size_t p = 0; p < places; ++p) {
            if (p >= readings[f].size() || !stands(f, p, readings[f][p])) {
                since_[f][p] = -1;
                continue;
            }
            now_[f][p] = readings[f][p].position;
            if (since_[f][p] >= 0 || !begins(f, p, readings[f])) continue;
            since_[f][p] = time_s;
            start_[f][p] = now_[f][p];
            removed_[f][p].assign(amounts_, 0);
        }
    }
}

std::vector<ShapePart> ShapeLedger::parts() const {
    std::vector<ShapePart> parts;
    const double h = domain_.spacing;
    for (std::size_t f = 0; f < since_.size(); ++f) {
        ShapePart part;
        part.opening = f / faces_each;
        const std::size_t face = f % faces_each;
        const bool floor = face == floor_face;
        part.face = floor                        ? ShapePart::Face::floor
                    : sites_[part.opening].round ? ShapePart::Face::wall
                    : face == left_or_all        ? ShapePart::Face::left_wall
                                                 : ShapePart::Face::right_wall;
        for (std::size_t p = 0; p < since_[f].size(); ++p)
            if (since_[f][p] >= 0)
                part.places.push_back({(floor ? first_ : -top_) + (double(p) + 0.5) * h,
                                       since_[f][p], start_[f][p], now_[f][p], removed_[f][p]});
        if (!floor)
            for (ShapePart::Place& place : part.places)
                place.at_nm = -place.at_nm;
        if (!part.places.empty()) parts.push_back(std::move(part));
    }
    return parts;
}

} // namespace rille::engine
