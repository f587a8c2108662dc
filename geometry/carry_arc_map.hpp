// SPDX-License-Identifier: Apache-2.0
// Private to geometry: where the elements of a contour have come to lie on the next one.
#pragma once

#include "geometry/carry.hpp"
#include "geometry/element_bins.hpp"

namespace rille::geometry {

/// A place on the new surface: an element's chain and the arc from the first chain's start [nm].
struct Place {
    int chain = -1;
    double arc = 0;
    int element = -1;
};

/// Elements [first, last) of the new surface that hang together.
struct ArcChain {
    int first = 0, last = 0;
    bool closed = false;
    double length = 0; ///< [nm]
};

/// The ends of every old element, moved as the front moved, as places on the new surface.
class ArcMap {
public:
    explicit ArcMap(const CarryTask&);

    /// Signed length of the new chain that old element e covers; false if it was torn.
    bool covered(int e, double& length) const;
    const Place& low(int e) const { return low_[e]; }
    const Place& high(int e) const { return high_[e]; }
    Place place(const Vec3& p) const;
    const std::vector<ArcChain>& chains() const { return chains_; }
    const std::vector<double>& arc() const { return arc_; } ///< at the start of each element
    int chain_of(int element) const { return chain_of_[element]; }
    /// Through the nearest image.
    Vec3 nearest(Vec3 d) const;
    /// Whether element e and the one after it meet in a corner.
    static bool is_corner(const Surface&, int e);

private:
    void list_chains();
    void move_vertices();
    Vec3 displacement(int a, int b) const;
    template <class Visit>
    double walk(int e, bool back, double length, const Visit& visit) const;
    Vec3 direction(int a, int b) const;
    void locate();
    void snap(Place& p, bool start, bool end = false) const;
    double ahead(const Place& a, const Place& b) const;
    void pin_corners();
    void pin(int e, const Place& corner);

    const CarryTask& task_;
    const Surface &from_, &to_;
    double mean_, longest_ = 0; ///< [nm] elements of the new surface
    ElementBins bins_;
    std::vector<ArcChain> chains_;
    std::vector<double> arc_;
    std::vector<int> chain_of_;
    std::vector<Vec3> start_, end_; ///< of old elements, moved
    std::vector<Place> low_, high_;
};

} // namespace rille::geometry
