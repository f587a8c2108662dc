// SPDX-License-Identifier: Apache-2.0
#include "fluxes/first_strikes.hpp"

#include "fluxes/ion_reflection.hpp"

#include <tbb/blocked_range.h>
#include <tbb/parallel_for.h>

#include <algorithm>
#include <cmath>
#include <numeric>

namespace rille::fluxes {
namespace {

constexpr double pi = 3.14159265358979323846;

/// Index i with below[i] <= at < below[i + 1], of positive width, and the part below `at` in it.
struct Drawn {
    std::size_t index;
    double part;
};
Drawn draw_from(const std::vector<double>& below, double u) {
    const double at = u * below.back();
    // Nobody can guess the way: a search without branches for the first above.
    const double* first = below.data();
    for (std::size_t count = below.size(); count > 0;) {
        const std::size_t half = count / 2;
        const bool beyond = first[half] <= at;
        first += beyond ? half + 1 : 0;
        count = beyond ? count - half - 1 : half;
    }
    std::size_t above = first - below.data();
    if (above == below.size())
        above = std::lower_bound(below.begin(), below.end(), below.back()) - below.begin();
    const std::size_t i = above - 1;
    return {i, std::clamp((at - below[i]) / (below[i + 1] - below[i]), 0.0, 1.0)};
}

/// Ion of one slope in the plane; out of the plane as the node says (to which side does not matter
/// where nothing varies along y).
IonSample ion_of(const InPlane& plane, const InPlane::Node& node, double slope, double u) {
    const auto& spectrum = plane.spectra[node.spectrum];
    std::size_t k = 0;
    for (; k + 1 < spectrum.size() && u >= spectrum[k].share; ++k)
        u -= spectrum[k].share;
    const double across =
        std::max(0.0, 1 / (node.cos_polar * node.cos_polar) - 1 - node.slope * node.slope);
    return {spectrum[k].energy_ev, Vec3(-slope, std::sqrt(across), -1).normalized()};
}

} // namespace

ReflectionBound::ReflectionBound(const std::vector<IonReflection>& laws) {
    for (const IonReflection& law : laws)
        for (int i = 0; i <= cells; ++i)
            table_.push_back(reflection_probability(law, double(i) / cells));
}

ExtrudedStrikes::ExtrudedStrikes(const StrikeScene& scene)
    : scene_(scene), sky_(scene.domain, scene.surface) {
    const IonTables& tables = scene.direct.tables();
    const int count = static_cast<int>(scene.surface.size());
    over_.resize(count);
    tbb::parallel_for(0, count, [&](int e) {
        if (scene.bound(scene.material[e], 0) > 0) over_[e] = sky_over(e);
    });
    guide_.resize(tables.ions().size());
    for (std::size_t s = 0; s < guide_.size(); ++s) {
        const InPlane& plane = tables.in_plane(static_cast<int>(s));
        Guide& guide = guide_[s];
        guide.table = &tables.plane_table(static_cast<int>(s));
        guide.element.resize(count);
        tbb::parallel_for(0, count,
                          [&](int e) { guide.element[e] = guide_of(plane, *guide.table, e); });
        guide.below.assign(1, 0.0);
        for (int e = 0; e < count; ++e) {
            const auto& below = guide.element[e].below;
            const double own = below.empty() ? 0 : below.back();
            guide.below.push_back(guide.below.back() +
                                  tables.ions()[s].flux * scene.surface.area[e] * own);
        }
    }
}

/// Along a segment both horizons turn one way: its ends decide.
ExtrudedStrikes::Sky ExtrudedStrikes::sky_over(int e) const {
    if (sky_.floating_pieces()) return {{-0.5 * pi, 0.5 * pi}, {0.5 * pi, -0.5 * pi}};
    Sky sky{{0.5 * pi, -0.5 * pi}, {-0.5 * pi, 0.5 * pi}};
    for (const double part : {0.0, 1.0}) {
        const auto seen = sky_.visible(e, part);
        if (seen.empty()) sky.every = {0.5 * pi, -0.5 * pi};
        for (const Visible& v : seen) {
            sky.any.low = std::min(sky.any.low, v.low);
            sky.any.high = std::max(sky.any.high, v.high);
            sky.every.low = std::max(sky.every.low, v.low);
            sky.every.high = std::min(sky.every.high, v.high);
        }
    }
    return sky;
}

bool ExtrudedStrikes::sees(int e, double part, double phi) const {
    constexpr double margin = 1e-9; // round-off of horizons
    const Visible& every = over_[e].every;
    if (every.low + margin < phi && phi < every.high - margin) return true;
    const auto seen = sky_.visible(e, part);
    return std::any_of(seen.begin(), seen.end(),
                       [&](const Visible& v) { return v.low <= phi && phi <= v.high; });
}

ExtrudedStrikes::Bins ExtrudedStrikes::guide_of(const InPlane& plane, const PlaneTable& table,
                                                int e) const {
    Bins bins;
    const int material = scene_.material[e];
    const Visible& sky = over_[e].any;
    if (!(sky.low < sky.high)) return bins;
    bins.low = plane.place(sky.low);
    bins.high = plane.place(sky.high);
    const Vec3 &own = scene_.surface.normal[e], &mean = scene_.normal[e];
    // Turning out of the beam is monotonic in the slope, so the ends of an interval decide.
    const auto facing = [&](int b, int to) {
        return std::min(mean.z + table.slope[b] * mean.x, mean.z + table.slope[to] * mean.x);
    };
    if (!(scene_.bound(material, facing(bins.low.bin, bins.high.bin + 1) * table.least_cosine) > 0))
        return bins;
    bins.below.assign(1, 0.0);
    for (int b = bins.low.bin; b <= bins.high.bin; ++b) {
        const double received = 0.5 * (std::max(0.0, own.z + table.slope[b] * own.x) +
                                       std::max(0.0, own.z + table.slope[b + 1] * own.x));
        double sum = 0;
        if (received > 0)
            for (int g = table.first_group[b]; g < table.first_group[b + 1]; ++g)
                sum += table.groups[g].weight *
                       scene_.bound(material, facing(b, b + 1) * table.groups[g].least_cosine);
        bins.below.push_back(bins.below.back() + received * sum * std::max(0.0, bins.width(b)));
    }
    if (!(bins.below.back() > 0)) bins.below.clear();
    return bins;
}

double ExtrudedStrikes::total(int ion, int) const {
    return guide_[ion].below.back();
}

Strike ExtrudedStrikes::draw(int ion, int, const ScrambledPoints& points, std::uint32_t index,
                             int count) const {
    const InPlane& plane = scene_.direct.tables().in_plane(ion);
    // Where an ion lands next follows from its place and its in-plane deflection before all else.
    const auto p0 = points.pair(index, 0), p1 = points.pair(index, 1), p2 = points.pair(index, 2);
    const Drawn place = draw_from(guide_[ion].below, p0[0]);
    const int e = static_cast<int>(place.index);
    const PlaneTable& table = *guide_[ion].table;
    const Bins& bins = guide_[ion].element[e];
    const Drawn drawn = draw_from(bins.below, p1[0]);
    const int b = bins.low.bin + static_cast<int>(drawn.index);
    // Inside a bin the flux is uniform in the sine of the angle.
    const double sine = table.sine[b] + (table.sine[b + 1] - table.sine[b]) *
                                            (bins.from(b) + bins.width(b) * drawn.part);
    const double phi = std::asin(std::clamp(sine, -1.0, 1.0));
    const double slope = std::min(std::fabs(sine) / std::sqrt(std::max(1e-16, 1 - sine * sine)),
                                  PlaneTable::steepest) *
                         (sine < 0 ? -1 : 1);
    const Vec3& normal = scene_.surface.normal[e];
    const double received = normal.z + slope * normal.x;
    if (received <= 0 || !sees(e, place.part, phi)) return {};
    const auto first = table.below.begin() + table.first_node[b];
    const auto end = table.below.begin() + table.first_node[b + 1];
    const auto drawn_node = std::upper_bound(first, end - 1, p2[0] * table.share[b]);
    const int node = static_cast<int>(drawn_node - table.below.begin());
    const auto& corners = scene_.surface.corners[e];
    const Vec3 &a = scene_.surface.vertices[corners[0]], &z = scene_.surface.vertices[corners[1]];
    // (flux there) / (density of the draw) / count, the area of the element in both.
    const double density = bins.below[drawn.index + 1] - bins.below[drawn.index];
    const double carried =
        received * table.share[b] * bins.width(b) / density * guide_[ion].below.back() / count;
    return {e,       a + (z - a) * place.part,
            normal,  ion_of(plane, plane.nodes[node], slope, p2[1]),
            carried, {p0[1], p1[1]}};
}

namespace {

/// (r . n) / r_z of an ion that arrives, or 0 behind the element.
double received(const Launch& place, const IonSample& ion) {
    const Vec3 from = -ion.direction;
    return std::max(0.0, from.dot(place.normal)) / from.z;
}

} // namespace

double FullStrikes::guide(const Launcher& launcher, int group, int element, int batch,
                          int k) const {
    const DirectIons& direct = scene_.direct;
    if (!direct.arrives(group, element, batch, k)) return 0;
    const IonSample ion = direct.ion(group, element, batch, k);
    const double bound =
        scene_.bound(scene_.material[element], -scene_.normal[element].dot(ion.direction));
    if (!(bound > 0)) return 0;
    return bound * received(direct.place(launcher, group, element, batch, k), ion);
}

FullStrikes::FullStrikes(const StrikeScene& scene) : scene_(scene) {
    const int per_batch = scene.direct.rays_per_batch(), groups = scene.direct.groups();
    const int count = static_cast<int>(scene.surface.size());
    below_.assign(groups * batches, std::vector<double>(count + 1, 0.0));
    tbb::parallel_for(tbb::blocked_range<int>(0, count, 64), [&](const auto& range) {
        for (int e = range.begin(); e != range.end(); ++e) {
            if (!(scene.bound(scene.material[e], 0) > 0)) continue;
            const Launcher launcher(scene.surface, e);
            // Of warped quads the area is more than their projection.
            const double share = launcher.area() / per_batch;
            for (std::size_t i = 0; i < below_.size(); ++i)
                for (int k = 0; k < per_batch; ++k)
                    below_[i][e + 1] +=
                        share * guide(launcher, int(i) / batches, e, int(i) % batches, k);
        }
    });
    tbb::parallel_for(std::size_t(0), below_.size(), [&](std::size_t i) {
        std::partial_sum(below_[i].begin(), below_[i].end(), below_[i].begin());
    });
}

double FullStrikes::total(int ion, int batch) const {
    return scene_.direct.tables().ions()[ion].flux * below(ion, batch).back();
}

Strike FullStrikes::draw(int ion, int batch, const ScrambledPoints& points, std::uint32_t index,
                         int count) const {
    const int per_batch = scene_.direct.rays_per_batch(), group = scene_.direct.group_of(ion);
    const auto p0 = points.pair(index, 0);
    const Drawn drawn = draw_from(below(ion, batch), p0[0]);
    const int e = static_cast<int>(drawn.index);
    const Launcher launcher(scene_.surface, e);
    std::vector<double> part(per_batch);
    double all = 0;
    for (int k = 0; k < per_batch; ++k)
        all += part[k] = guide(launcher, group, e, batch, k);
    double left = drawn.part * all;
    int ray = -1;
    for (int k = 0; k < per_batch && (ray < 0 || left >= 0); ++k) {
        if (!(part[k] > 0)) continue;
        ray = k;
        left -= part[k];
    }
    const IonSample drawn_ion = scene_.direct.ion(group, e, batch, ray);
    const Launch place = scene_.direct.place(launcher, group, e, batch, ray);
    const double carried = total(ion, batch) / count * received(place, drawn_ion) / part[ray];
    return {e, place.point, place.normal, drawn_ion, carried, {p0[1], points.pair(index, 1)[0]}};
}

} // namespace rille::fluxes
