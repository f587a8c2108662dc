// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "geometry/domain.hpp"
#include "geometry/grown_films.hpp"
#include "geometry/rates.hpp"
#include "geometry/stack.hpp"
#include "geometry/surface.hpp"

#include <cstdint>
#include <functional>
#include <iosfwd>
#include <memory>
#include <string>
#include <vector>

namespace rille::geometry {

struct Band;

/// The moving front: a sub-cell level set on a sparse grid. A value type; copying it is how a step
/// is tried and discarded.
class Front {
public:
    /// signed_distance(p) [nm], < 0 in the solid, exact within 4 cells of the surface. z_low and
    /// z_high [nm] bound the initial surface (all surface lies between them).
    Front(const Domain& domain, const std::function<double(const Vec3&)>& signed_distance,
          double z_low, double z_high);
    /// From cells in the order of a band and their phi; neighbours are found here.
    explicit Front(Band&&);
    Front(const Front&);
    Front(Front&&) noexcept;
    Front& operator=(const Front&);
    Front& operator=(Front&&) noexcept;
    ~Front();

    const Domain& domain() const;
    const Band& band() const;
    Band& band();
    /// Interpolated phi [nm] at p (wrapped into the period); clamped to the band's half-width.
    double distance(const Vec3& p) const;
    /// Re-establishes the band around the present zero contour.
    void rebuild();
    std::size_t memory_bytes() const;
    /// Exact state: write and read give the same bits.
    void save(std::ostream&) const;
    static Front load(std::istream&);
    /// OpenVDB file with one float grid "front" [nm], ZIP-compressed, world units nm.
    void write_vdb(const std::string& path) const;

private:
    struct State;
    std::unique_ptr<State> state_;
};

/// The front as elements: exactly one period, manifold, corners rebuilt where one-sided normals
/// differ by more than 30 degrees. Deterministic. `chain` 0 is open to the source above; further
/// chains are closed voids in the solid or pieces cut off from it (see topology.hpp).
Surface extract_surface(const Front&);

struct AdvanceLimits {
    double time = 0;       ///< [s] largest time to advance
    double max_move = 0.5; ///< [cells] stop when any point has moved this far (arrivals are stale)
    /// Courant number of one sub-step at edges; where the front is smooth twice this will do.
    double max_share = 0.45;
};

struct AdvanceReport {
    double time = 0; ///< [s] time advanced, <= limits.time
    int sub_steps = 0;
    double largest_move = 0;     ///< [cells]
    double redistance_shift = 0; ///< [cells] largest movement of the contour by redistancing
    std::vector<double> moved;   ///< [nm] per element of the given surface, along -normal
};

/// Moves the front at fixed arrivals: second order in space with local Lax-Friedrichs over all
/// one-sided slopes, two-stage Runge-Kutta, sub-cycled, exact through films thinner than a cell
/// (each peeled at its own rate). `surface` must be extract_surface(front) before the call. The
/// thicknesses in `films` are on its elements and are updated on those same elements (use
/// carry_fields to bring them to the new surface): etching first removes grown films from the
/// outside in, then the stack; growth (rate < 0) adds to grown film `growth_film[e]`, or throws
/// InternalError if that is -1.
/// Throws NumericsError if the front comes within 2 cells of z_floor.
AdvanceReport advance(Front&, const Surface& surface, const NormalRates&, const Stack&,
                      GrownFilms& films, const std::vector<int>& growth_film, double z_floor,
                      const AdvanceLimits&);

} // namespace rille::geometry
