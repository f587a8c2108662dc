// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "geometry/band.hpp"
#include "geometry/rates.hpp"

#include <array>
#include <cstddef>
#include <vector>

namespace rille::geometry {

/// One-sided slopes of phi at a cell, second order (minmod-limited); axes x, y, z. Where the band ends
/// the slope of the other side continues; so it does where `unseen` hides a neighbour (bit s: side s).
struct Slopes {
    double minus[3] = {0, 0, 0}, plus[3] = {0, 0, 0};
    double mean(int axis) const { return 0.5 * (minus[axis] + plus[axis]); }
};
Slopes slopes_2d(const Band&, const double* phi, std::size_t cell, double inverse_spacing,
                 unsigned unseen = 0);
Slopes slopes_3d(const Band&, const double* phi, std::size_t cell, double inverse_spacing,
                 unsigned unseen = 0);

/// A normal as the rate tables see it: the angle with its sine and cosine.
struct Tilt {
    double angle = 0, sine = 0, cosine = 1;
};
/// extruded: angle atan2(g.x, g.z); full: angle between g and +z.
Tilt tilt_of(bool extruded, double gx, double gy, double gz);

/// Largest |dH/dp| over a range of tilts for H(p) = R(tilt) |p|: along the horizontal direction of
/// the normal and along z [nm/s].
struct WaveSpeed {
    double horizontal = 0, vertical = 0;
};

/// Fast reading of the tables of a NormalRates: they must outlive this object.
class RateTables {
  public:
    explicit RateTables(const NormalRates& rates);
    /// Rate of `row` [nm/s]; row -1 has rate 0.
    double rate(int row, double angle) const {
        if (row < 0) return 0;
        if (constant_[row]) return values(row)[0];
        const int s = segment(angle);
        const double* v = values(row) + s;
        return v[0] + (v[1] - v[0]) * ((angle - rates_.angles[s]) * inverse_width_[s]);
    }
    bool constant(int row) const { return row < 0 || constant_[row]; }
    /// Whether a row has any rate but 0.
    bool moves(int row) const { return row >= 0 && (!constant_[row] || values(row)[0] != 0); }
    /// Over tilts from `low` to `high`, low.angle <= high.angle, both within the table.
    WaveSpeed wave_speed(int row, const Tilt& low, const Tilt& high) const;

  private:
    int segment(double angle) const;
    const double* values(int row) const {
        return rates_.table.data() + static_cast<std::size_t>(row) * rates_.angles.size();
    }
    const NormalRates& rates_;
    std::vector<int> bin_;
    double bins_per_radian_ = 0;
    std::vector<double> inverse_width_, sine_, cosine_;
    std::vector<char> constant_;
};

/// |grad phi| by Godunov's choice of one-sided slopes, for a rate that does not depend on the normal
/// (`recedes`: the solid recedes, else it grows), and in `waves` the sum of |n_x|, |n_y|, |n_z|.
double upwind_steepness(const Slopes&, bool recedes, double& waves);

/// Dissipation coefficients of local Lax-Friedrichs for one cell and row, x, y, z [nm/s].
std::array<double, 3> dissipation(const RateTables&, int row, bool extruded, const Slopes&);

} // namespace rille::geometry
