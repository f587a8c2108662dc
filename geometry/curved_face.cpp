// SPDX-License-Identifier: Apache-2.0
#include "geometry/curved_face.hpp"

#include <Eigen/Cholesky>

#include <algorithm>
#include <cmath>

namespace rille::geometry {

namespace {

constexpr double edge_cosine = 0.866;  ///< 30 deg between one-sided normals: an edge
constexpr double third_cosine = 0.6;   ///< 53 deg to both faces of an edge: a third face
constexpr double seed_reach = 1.6;     ///< [cells] faces are looked for within
constexpr double near_reach = 2.6;     ///< [cells] samples count by their distance from the vertex
constexpr double undisturbed = 2.2;    ///< [cells] of a crossing from the other face
constexpr double steady_beyond = 2.4;  ///< [cells] the same of an element's normal
constexpr double bend_scale = 0.35;    ///< [1 / cell] curvature that needs no evidence
constexpr double normal_scatter = 0.1; ///< [rad] of the samples' normals
constexpr double largest_scatter = 0.16; ///< of the angle between faces
constexpr double largest_offset = 0.12;  ///< [cells] rms of the samples from their face
constexpr double least_weight = 0.4;     ///< of the samples of a face
constexpr double corner_weight = 0.01;   ///< the same at a corner of three
constexpr double spike_reach = 1.6;      ///< [cells] nearer crossings must lie near the solid
constexpr double largest_spike = 0.6;    ///< [cells] between flat faces
constexpr double least_spike = 0.25;     ///< [cells] between round ones
constexpr double spike_per_bend = 2.0;   ///< [cells^2]
constexpr double own_cosine = 0.8;       ///< 37 deg: samples further off belong to no face
constexpr double own_distance = 0.6;     ///< [cells] the same

double square(double x) {
    return x * x;
}

double eighth_power(double x) {
    return square(square(square(x)));
}

} // namespace

void CurvedFace::fit(const std::vector<FaceSample>& samples, int f, bool curved) {
    Vec3 point(0, 0, 0), mean(0, 0, 0);
    double steady = 0;
    weight = 0;
    for (const FaceSample& s : samples) {
        if (s.face != f) continue;
        point += s.point * s.weight;
        mean += s.normal * s.steady;
        steady += s.steady;
        weight += s.weight;
    }
    height.fill(0);
    if (!(weight > 1e-9) || !(mean.length() > 1e-9 * steady)) return void(weight = 0);
    origin = point / weight;
    normal = mean.normalized();
    // Any frame of the plane will do; this one is steady for faces along the grid.
    const Vec3 helper = std::fabs(normal.z) < 0.7 ? Vec3(0, 0, 1) : Vec3(1, 0, 0);
    across = helper.cross(normal).normalized();
    along = normal.cross(across);
    if (!curved) return;
    // Sums of weight a^m b^n that the normal equations are made of: `p` over positions, `q` over
    // normals.
    double p[5][5] = {}, q[3][3] = {}, right[6] = {};
    for (const FaceSample& s : samples) {
        if (s.face != f || s.weight + s.steady < 1e-6) continue;
        const Vec3 d = s.point - origin;
        const double a = d.dot(across), b = d.dot(along), n = s.normal.dot(normal);
        const double powers_a[5] = {1, a, a * a, a * a * a, a * a * a * a};
        double w = s.weight;
        for (int j = 0; j < 5; ++j, w *= b)
            for (int i = 0; i + j < 5; ++i)
                p[i][j] += w * powers_a[i];
        const double c = s.weight * d.dot(normal);
        right[0] += c;
        right[1] += c * a;
        right[2] += c * b;
        right[3] += 0.5 * c * a * a;
        right[4] += 0.5 * c * b * b;
        right[5] += c * a * b;
        if (n < 0.3) continue;
        w = s.steady;
        const double ga = -w * s.normal.dot(across) / n, gb = -w * s.normal.dot(along) / n;
        q[0][0] += w;
        q[1][0] += w * a;
        q[0][1] += w * b;
        q[2][0] += w * a * a;
        q[1][1] += w * a * b;
        q[0][2] += w * b * b;
        right[1] += ga;
        right[2] += gb;
        right[3] += ga * a;
        right[4] += gb * b;
        right[5] += ga * b + gb * a;
    }
    using Matrix = Eigen::Matrix<double, 6, 6>;
    using Vector = Eigen::Matrix<double, 6, 1>;
    Matrix left; // rows and columns: 1, a, b, a^2 / 2, b^2 / 2, a b
    static constexpr int power_a[6] = {0, 1, 0, 2, 0, 1}, power_b[6] = {0, 0, 1, 0, 2, 1};
    static constexpr double factor[6] = {1, 1, 1, 0.5, 0.5, 1};
    for (int m = 0; m < 6; ++m)
        for (int n = 0; n < 6; ++n)
            left(m, n) =
                factor[m] * factor[n] * p[power_a[m] + power_a[n]][power_b[m] + power_b[n]];
    // Slopes along a: 1 for a, a for a^2 / 2, b for a b; along b: 1 for b, b for b^2 / 2, a for a
    // b.
    const auto add = [&left](int m, int n, double value) {
        left(m, n) += value;
        if (m != n) left(n, m) += value;
    };
    add(1, 1, q[0][0]);
    add(1, 3, q[1][0]);
    add(1, 5, q[0][1]);
    add(3, 3, q[2][0]);
    add(3, 5, q[1][1]);
    add(5, 5, q[0][2] + q[2][0]);
    add(2, 2, q[0][0]);
    add(2, 4, q[0][1]);
    add(2, 5, q[1][0]);
    add(4, 4, q[0][2]);
    add(4, 5, q[1][1]);
    const double hold = square(normal_scatter / bend_scale);
    for (int m = 3; m < 6; ++m)
        left(m, m) += hold;
    for (int m = 0; m < 3; ++m)
        left(m, m) += 1e-9;
    const Vector x = left.ldlt().solve(Eigen::Map<const Vector>(right));
    for (int m = 0; m < 6; ++m)
        height[m] = x[m];
}

double LocalSolid::value(const Vec3& p) const {
    const double f0 = face[0].value(p), f1 = face[1].value(p);
    if (count == 2) return convex(0, 1) ? std::max(f0, f1) : std::min(f0, f1);
    const double f[3] = {f0, f1, face[2].value(p)};
    const bool c01 = convex(0, 1), c02 = convex(0, 2), c12 = convex(1, 2);
    const int convex_pairs = c01 + c02 + c12;
    if (convex_pairs == 3) return std::max({f[0], f[1], f[2]});
    if (convex_pairs == 0) return std::min({f[0], f[1], f[2]});
    // The odd pair belongs together; the third face meets both in the other way.
    const bool odd = convex_pairs == 1;
    const int alone = c12 == odd ? 0 : c02 == odd ? 1 : 2;
    const double a = f[(alone + 1) % 3], b = f[(alone + 2) % 3];
    return odd ? std::min(f[alone], std::max(a, b)) : std::max(f[alone], std::min(a, b));
}

namespace {

void measure_nearness(std::vector<FaceSample>& samples) {
    for (FaceSample& s : samples)
        s.near = s.trust * std::exp(-0.5 * s.point.dot(s.point) / (near_reach * near_reach));
}

/// The pair of samples near the vertex whose normals differ most, and a third that differs from
/// both; false where nothing differs by 30 degrees.
bool find_seeds(const std::vector<FaceSample>& samples, int (&seed)[3]) {
    const int size = static_cast<int>(samples.size());
    std::vector<double> close(size);
    for (int a = 0; a < size; ++a)
        close[a] = samples[a].trust *
                   std::exp(-0.5 * samples[a].point.length2() / (seed_reach * seed_reach));
    double most = 0;
    seed[0] = seed[1] = seed[2] = -1;
    for (int a = 0; a < size; ++a)
        for (int b = a + 1; b < size; ++b) {
            const double both = close[a] * close[b];
            if (2 * both <= most) continue;
            const double turn = 1 - samples[a].normal.dot(samples[b].normal);
            if (turn * close[a] * close[b] <= most + 1e-9 || turn < 1 - edge_cosine) continue;
            most = turn * close[a] * close[b];
            seed[0] = a;
            seed[1] = b;
        }
    if (seed[0] < 0) return false;
    double best = 0;
    for (int c = 0; c < size; ++c) {
        const double cosine = std::max(samples[c].normal.dot(samples[seed[0]].normal),
                                       samples[c].normal.dot(samples[seed[1]].normal));
        if (cosine > third_cosine || (1 - cosine) * close[c] <= best + 1e-9) continue;
        best = (1 - cosine) * close[c];
        seed[2] = c;
    }
    return true;
}

/// Gives each sample to the face it fits best, and weights against what disturbs a fit: distance,
/// and the other face within the reach of its bend in phi.
void assign(std::vector<FaceSample>& samples, const LocalSolid& solid) {
    for (FaceSample& s : samples) {
        double best = 1e300, offs[3] = {};
        s.face = -1;
        for (int f = 0; f < solid.count; ++f) {
            const CurvedFace::Place at = solid.face[f].at(s.point);
            const double off = std::fabs(at.value), cosine = s.normal.dot(at.normal);
            offs[f] = off;
            const double misfit =
                square(off / own_distance) + square((1 - cosine) / (1 - own_cosine));
            if (misfit >= best) continue;
            best = misfit;
            s.face = f;
        }
        if (best > 1) s.face = -1;
        if (s.face < 0) continue;
        double away = steady_beyond;
        for (int f = 0; f < solid.count; ++f)
            if (f != s.face) away = std::min(away, offs[f]);
        s.weight = s.near * eighth_power(std::min(1.0, away / undisturbed));
        s.steady = s.near * eighth_power(away / steady_beyond);
    }
}

/// Whether the faces are ones that the samples surely have.
bool distinct(const std::vector<FaceSample>& samples, const LocalSolid& solid) {
    double angle = 4;
    for (int a = 0; a < solid.count; ++a)
        for (int b = 0; b < a; ++b) {
            const double cosine =
                solid.face[a].normal_at(Vec3(0)).dot(solid.face[b].normal_at(Vec3(0)));
            angle = std::min(angle, std::acos(std::clamp(cosine, -1.0, 1.0)));
        }
    if (angle < std::acos(edge_cosine)) return false;
    double bend = 0;
    for (int f = 0; f < solid.count; ++f)
        for (int m = 3; m < 6; ++m)
            bend = std::max(bend, std::fabs(solid.face[f].height[m]));
    const double spike = std::max(least_spike, largest_spike - spike_per_bend * bend);
    for (const FaceSample& s : samples)
        if (s.point.length2() < square(spike_reach) && std::fabs(solid.value(s.point)) > spike)
            return false;
    double turns[3] = {0, 0, 0}, offsets[3] = {0, 0, 0}, steady[3] = {0, 0, 0};
    for (const FaceSample& s : samples) {
        if (s.face < 0) continue;
        const CurvedFace::Place at = solid.face[s.face].at(s.point);
        turns[s.face] += s.steady * 2 * (1 - s.normal.dot(at.normal));
        steady[s.face] += s.steady;
        offsets[s.face] += s.weight * square(at.value);
    }
    for (int f = 0; f < solid.count; ++f) {
        const double weight = solid.face[f].weight;
        if (turns[f] > steady[f] * square(largest_scatter * angle)) return false;
        if (offsets[f] > weight * square(largest_offset)) return false;
    }
    return true;
}

bool split(std::vector<FaceSample>& samples, const int (&seed)[3], int count, LocalSolid& solid) {
    solid.count = count;
    for (FaceSample& s : samples) {
        double nearest = 0.7;
        s.face = -1;
        for (int f = 0; f < count; ++f) {
            const double cosine = s.normal.dot(samples[seed[f]].normal);
            if (cosine <= nearest) continue;
            nearest = cosine;
            s.face = f;
        }
        s.weight = s.steady = s.near;
    }
    for (int f = 0; f < count; ++f)
        solid.face[f].fit(samples, f, false);
    const double least = count > 2 ? corner_weight : least_weight;
    for (int round = 0; round < 3; ++round) {
        for (int f = 0; f < count; ++f)
            if (!(solid.face[f].weight > 0)) return false;
        assign(samples, solid);
        for (int f = 0; f < count; ++f)
            solid.face[f].fit(samples, f, true);
    }
    for (int f = 0; f < count; ++f)
        if (!(solid.face[f].weight > least)) return false;
    return distinct(samples, solid);
}

} // namespace

bool find_faces(std::vector<FaceSample>& samples, LocalSolid& solid) {
    int seed[3];
    if (samples.size() < 6 || !find_seeds(samples, seed)) return false;
    measure_nearness(samples);
    return (seed[2] >= 0 && split(samples, seed, 3, solid)) || split(samples, seed, 2, solid);
}

} // namespace rille::geometry
