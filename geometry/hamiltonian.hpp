// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "geometry/flux_lanes.hpp"
#include "geometry/rates.hpp"
#include "geometry/slopes.hpp"

#include <array>
#include <cstddef>
#include <vector>

namespace rille::geometry {

/// A normal as the rate tables see it: the angle with its sine and cosine.
struct Tilt {
    double angle = 0, sine = 0, cosine = 1;
    int segment = -1; ///< of the rate tables, where the angle lies or near it; -1: not known
};
/// planar contour: angle atan2(g.x, g.z); full: angle between g and +z.
Tilt tilt_of(bool planar, double gx, double gy, double gz);

/// Largest |dH/dp| over a range of tilts for H(p) = R(tilt) |p|: along the horizontal direction of
/// the normal and along z [nm/s].
struct WaveSpeed {
    double horizontal = 0, vertical = 0;
};

/// Rows of two neighbours, interpolated: (1 - share) row + share other; -1 has rate 0.
struct RowPair {
    int row = -1, other = -1;
    double share = 0; ///< of `other`; 0 where there is none
};

/// Part of one row about the angle where it will be read: rows come in no order and the tables are
/// large, so what is read again and again is kept together.
struct alignas(64) RateWindow {
    static constexpr int size = 6;
    int row = -1;
    short first = 0; ///< index of the first value
    bool constant = true, moves = false;
    double value[size] = {};
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
    double rate(const RowPair& pair, double angle) const {
        const double own = rate(pair.row, angle);
        return pair.share > 0 ? own + pair.share * (rate(pair.other, angle) - own) : own;
    }
    /// The tilt of a slope, as tilt_of, and its length; without calling an arc function. Its
    /// segment is still to be found.
    Tilt tilt(double horizontal, double vertical, double& length) const;
    void find_segment(Tilt& t) const { t.segment = segment(t.angle); }
    /// Sets what find_tilts and find_fluxes ask for in the first lanes, or in one lane whose row is
    /// that of the window; false where the window does not hold it.
    void look_up_marks(FluxLanes&, int used) const;
    bool look_up_nodes(FluxLanes&, int lane, const RateWindow&) const;
    /// Part of `row` about `angle`.
    RateWindow window(int row, double angle) const;
    /// Rate at a tilt that came from `tilt`. The window is used for what it holds; the result is
    /// the same with any.
    double rate(const RowPair& pair, const Tilt& t, const RateWindow& window) const {
        const double part = (t.angle - rates_.angles[t.segment]) * inverse_width_[t.segment];
        const auto read = [&](int row) {
            if (row < 0) return 0.0;
            const double* v = values(row, t.segment, t.segment, window);
            return v[0] + (v[1] - v[0]) * part;
        };
        const double own = read(pair.row);
        return pair.share > 0 ? own + pair.share * (read(pair.other) - own) : own;
    }
    bool constant(int row) const { return row < 0 || constant_[row]; }
    /// Whether a row has any rate but 0.
    bool moves(int row) const { return row >= 0 && (!constant_[row] || values(row)[0] != 0); }
    bool constant(const RowPair& p) const {
        return constant(p.row) && (p.share == 0 || constant(p.other));
    }
    bool moves(const RowPair& p) const { return moves(p.row) || (p.share > 0 && moves(p.other)); }
    bool constant(const RowPair& p, const RateWindow& w) const {
        return p.share == 0 && p.row == w.row ? w.constant : constant(p);
    }
    bool moves(const RowPair& p, const RateWindow& w) const {
        return p.share == 0 && p.row == w.row ? w.moves : moves(p);
    }
    /// Over tilts from `low` to `high`, low.angle <= high.angle, both within the table.
    WaveSpeed wave_speed(int row, const Tilt& low, const Tilt& high, const RateWindow&) const;
    /// The same for a narrow cone about a tilt of `segment`: low and high come from it.
    WaveSpeed wave_speed_of_cone(int row, const Tilt& low, const Tilt& high,
                                 const RateWindow&) const;

private:
    int segment(double angle) const;
    int segment(const Tilt& t) const;
    const double* values(int row) const {
        return rates_.table.data() + static_cast<std::size_t>(row) * rates_.angles.size();
    }
    /// The values from segment `first` to the end of segment `last`.
    const double* values(int row, int first, int last, const RateWindow& window) const {
        const bool held = row == window.row && first >= window.first &&
                          last + 1 < window.first + RateWindow::size;
        return held ? window.value + (first - window.first) : values(row) + first;
    }
    const NormalRates& rates_;
    std::vector<Tilt> marks_; ///< where each bin of turns starts
    std::vector<int> bin_;
    double bins_per_radian_ = 0;
    std::vector<double> inverse_width_, sine_, cosine_;
    std::vector<char> constant_;
};

/// |grad phi| by Godunov's choice of one-sided slopes, for a rate that does not depend on the
/// normal
/// (`recedes`: the solid recedes, else it grows), and in `waves` the sum of |n_x|, |n_y|, |n_z|.
double upwind_steepness(const Slopes&, bool recedes, double& waves);

struct Speed {
    double waves = 0;    ///< sum of |dH/dp| along the axes [nm/s]
    bool smooth = false; ///< no edge passes the cell
    double rate = 0;     ///< of the front along its normal [nm/s]
};

/// dphi/dt [nm/s] of a cell by local Lax-Friedrichs: R(n) |grad phi| at the mean slopes plus, along
/// each axis, half the largest |dH/dp| over the box of slopes times their difference.
double lax_friedrichs(const RateTables&, const RowPair&, const RateWindow&, bool planar,
                      const Slopes&, Speed&);

} // namespace rille::geometry
