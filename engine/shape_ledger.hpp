// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "fluxes/causes.hpp"
#include "geometry/domain.hpp"
#include "geometry/fold.hpp"
#include "geometry/metrology.hpp"
#include "geometry/surface.hpp"

#include <cstddef>
#include <vector>

namespace rille::engine {

struct Case;

/// What has moved one face of an opening since it first stood there, place by place: walls away
/// from the axis at each height, the floor downwards at each distance from the axis.
struct ShapePart {
    enum class Face { left_wall, right_wall, wall, floor }; ///< wall: all round a round opening
    struct Place {
        double at_nm = 0;    ///< height z of a wall; x - axis (round: radius) of a floor
        double since_s = 0;  ///< when the face was first there
        double start_nm = 0; ///< where it was then: distance from the axis, or z of a floor
        double now_nm = 0;   ///< where it is
        /// How far each cause has moved it, then flux x d(rate)/d(flux) of each supply in the same
        /// measure [nm].
        std::vector<double> removed;
    };
    std::size_t opening = 0; ///< index into Case::mask.openings
    Face face = Face::floor;
    std::vector<Place> places; ///< from the top down, or along +x

    double moved_nm(const Place& p) const {
        return face == Face::floor ? p.start_nm - p.now_nm : p.now_nm - p.start_nm;
    }
    /// The way that the causes do not add up to: error of steps and grid.
    double unexplained_nm(const Place&) const;
};

/// The account behind ShapePart, at places one grid spacing long. At each place it begins when a
/// wall steeper than 65 deg first stands there and five places further down, as when the foot has
/// passed the height, or a floor flatter than 45 deg; it ends when the wall is less steep than 45
/// deg or the floor steeper than 65 deg, and begins anew when the face comes again. A face that
/// recedes at R along its normal n moves at R / |n_h| sideways at a fixed height and at R / n_z
/// downwards at a fixed place, so that the causes of R add up to its way over time.
class ShapeLedger {
public:
    explicit ShapeLedger(const Case&);

    /// What is at one place of one face: averages over the elements there.
    struct Reading {
        double weight = 0;         ///< how much of the face lies there [nm, or nm^2 in full]
        double position = 0;       ///< as ShapePart::Place::now_nm
        double lean = 0;           ///< part of the normal along z (wall) or level (floor)
        std::vector<double> speed; ///< by cause and supply [nm/s]
        void add(double size, double at, double leans, const std::vector<double>& rates,
                 double facing);
    };
    using Readings = std::vector<std::vector<Reading>>; ///< [face of opening][place]
    /// Rates of causes and supplies as in fluxes::SurfaceStep; both empty: places only.
    Readings read(const geometry::Surface&, const fluxes::CauseFields& cause,
                  const fluxes::CauseFields& supply) const;
    /// A step between two surfaces with these readings.
    void add(double dt_s, const Readings& at_start, const Readings& at_end);
    /// Which faces stand on the surface that this time has reached, and where.
    void stand(double time_s, const geometry::Surface&);

    /// Faces that stand now.
    std::vector<ShapePart> parts() const;

    /// Lists what changes, for saving and reading back.
    template <class Archive, class Self>
    static void visit(Archive& archive, Self& self) {
        archive(self.since_);
        archive(self.start_);
        archive(self.now_);
        archive(self.removed_);
    }

private:
    struct Spot {
        std::size_t opening = 0;
        double across = 0;  ///< x - axis of the opening, or distance from the axis if round
        double outward = 0; ///< part of the normal along that
    };
    Spot spot(const geometry::Vec3& at, const geometry::Vec3& normal) const;
    /// An element, or one of its mirror images in the whole period.
    struct Patch {
        geometry::Vec3 centre, normal;
        std::vector<geometry::Vec3> corners;
        double area = 0;
    };
    Patch patch(const geometry::Surface&, std::size_t element, int copy) const;
    void put(const Patch&, const std::vector<double>& rates, Readings&) const;
    void put_wall(const Patch&, const Spot&, const std::vector<double>& rates, Readings&) const;
    void put_floor(const Patch&, const Spot&, const std::vector<double>& rates, Readings&) const;
    bool begins(std::size_t face, std::size_t place, const std::vector<Reading>&) const;
    bool stands(std::size_t face, std::size_t place, const Reading&) const;

    geometry::Domain domain_; ///< the whole period
    geometry::Fold fold_;
    geometry::Vec3 origin_; ///< of the part that surfaces cover
    std::vector<geometry::FeatureSite> sites_;
    double top_ = 0;         ///< heights are counted down from here [nm]
    double first_ = 0;       ///< places of floors are counted from here [nm]
    double floor_below_ = 0; ///< what lies higher is no floor [nm]
    std::size_t amounts_ = 0;
    // [face][place]; since_ < 0 where no face stands.
    std::vector<std::vector<double>> since_, start_, now_;
    std::vector<std::vector<std::vector<double>>> removed_;
};

} // namespace rille::engine
