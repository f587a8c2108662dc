// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "geometry/domain.hpp"
#include "geometry/surface.hpp"

#include <optional>
#include <vector>

namespace rille::geometry {

/// A vertical cut through the surface near one feature: straight pieces in the plane (u, z), where
/// u runs along x or y. Images beyond the sides are included, one period to either side of the
/// axis, so a feature may lie across a side; revolved: the cut through the axis of revolution, both
/// halves, without images. Walking from a piece's start to its end the gas lies
/// on the left.
class Section {
public:
    struct Piece {
        double u0, z0, u1, z1;
        double normal_u, normal_z; ///< components of the element's unit normal
        int element;
        int chain;
    };
    /// Where a level or an upright line meets a piece.
    struct Crossing {
        double u = 0, z = 0;
        const Piece* piece = nullptr;
    };
    /// The gas between two walls at one height; the axis, or most of the opening as drawn, is in
    /// it.
    struct Gap {
        Crossing left, right;
        double width() const { return right.u - left.u; }
    };
    /// At a vertex, `from_above` looks at the piece above it, `from_below` at the one below.
    enum class Side { from_above, from_below };

    /// The cut y = `plane` with u = x (axis 0), or x = `plane` with u = y (axis 1; not extruded).
    /// `centre` and `width` of the opening along u [nm].
    Section(const Domain&, const Surface&, int axis, double plane, double centre, double width);

    const std::vector<Piece>& pieces() const { return pieces_; }
    double centre() const { return centre_; }
    double width() const { return width_; }

    /// All crossings of the level z, sorted by u.
    std::vector<Crossing> level(double z, Side side = Side::from_above) const;
    std::optional<Gap> gap_at(double z, Side side = Side::from_above) const;
    /// Highest upward-facing surface at u below `z_from`.
    std::optional<Crossing> floor_below(double u, double z_from) const;

private:
    void add(const Domain&, const Piece& in_period, double period);
    void cut(const Surface&, int axis, double plane, std::vector<Piece>& out) const;

    double centre_, width_;
    std::vector<Piece> pieces_;
};

} // namespace rille::geometry
