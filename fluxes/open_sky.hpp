// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "fluxes/in_plane.hpp"
#include "fluxes/unrolled_chain.hpp"
#include "geometry/domain.hpp"
#include "geometry/surface.hpp"

#include <vector>

namespace rille::fluxes {

/// Interval of in-plane angles [rad] from which a point is seen; empty if low >= high.
struct Visible {
    double low = 0, high = 0;
};

/// What every element of an extruded surface sees of the sky, exactly, periods to either side
/// included.
///
/// Over the part of the surface that is open to the source the gas is simply connected, so the sky
/// seen from a point is one interval, bounded by the tangent to the surface walked to the left and
/// the tangent to the surface walked to the right. The tangent points are found with taut strings:
/// the string from a vertex runs over the tangent vertex and on along that vertex's own string (as
/// shortest paths in a polygon do), so one walk gives nearly all of them; below some overhangs the
/// surface is searched. Walks start at the highest vertex: nothing beyond it can hide anything.
/// Angles are unwrapped along the surface, which handles overhangs and spirals.
///
/// Pieces of solid that float in the gas break that picture; then the sky is found per point by
/// taking away the interval that each segment hides (slower, exact per point).
class OpenSky {
public:
    OpenSky(const geometry::Domain&, const geometry::Surface&);

    /// Flux through element e per length, relative to the flux through the wafer plane, of an
    /// in-plane distribution. Integrated over the segment, so the sum over elements of flux times
    /// length is the period, to round-off (with floating pieces: to the quadrature along segments).
    double flux(const InPlane&, int element) const;

    /// Intervals seen from the point at `part` in [0, 1] of element e. What the element itself
    /// hides is left out: it depends on the normal, which the caller may turn.
    std::vector<Visible> visible(int element, double part) const;

    /// The same for the cosine law.
    double cosine_flux(int element) const { return flux(cosine_, element); }

    bool floating_pieces() const { return !floating_.empty(); }

private:
    using Point = PlanePoint;
    /// Taut strings towards one side: parent vertex and the angle at which it is seen.
    struct Strings {
        std::vector<int> parent;
        std::vector<double> angle;
    };
    /// A vertex and the unwrapped angle at which it is seen.
    struct Tangent {
        int vertex;
        double angle;
    };
    /// A segment of any chain in the base period.
    struct Segment {
        Point a, b;
    };
    void unwrap_normals();
    void find_floating(const geometry::Domain&, const geometry::Surface&);
    static Strings pull(const std::vector<Point>&, const std::vector<double>& start_angle);
    static Tangent tangent(const std::vector<Point>&, const Strings&, const Point& from,
                           Tangent nearest);
    static Tangent farthest(const std::vector<Point>&, const Point& from, const Tangent& nearest);
    double flux_by_strings(const InPlane&, int position) const;
    double flux_by_points(const InPlane&, int element) const;
    std::vector<Visible> visible_by_segments(int element, double part) const;

    InPlane cosine_;
    std::vector<Point> point_;   ///< unrolled over one period (mirror: two) from the highest
    std::vector<double> normal_; ///< per unrolled segment, unwrapped [rad]
    std::vector<int> position_;  ///< element -> unrolled segment, or -1
    Strings left_, right_;       ///< right_: of the surface reflected in x and reversed
    std::vector<Point> reflected_;
    std::vector<double> length_;   ///< per element
    std::vector<Segment> segment_; ///< per element, for floating pieces
    std::vector<int> floating_;    ///< elements of floating pieces
    std::vector<char> lit_;        ///< per element: open to the sky or floating in the gas
    double period_ = 0;
    bool mirror_ = false;
    double x_min_ = 0;
};

} // namespace rille::fluxes
