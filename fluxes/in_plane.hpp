// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "fluxes/ion_laws.hpp"

#include <vector>

namespace rille::fluxes {

/// An ion distribution resolved by in-plane angle phi: the angle from the vertical, towards +x, of
/// the direction an ion comes FROM, projected on the plane y = 0. slope = tan(phi).
///
/// Inside a bin the flux is uniform in sin(phi), the cosine law's own measure, so that both running
/// integrals stay finite up to 90 deg and exact for the cosine law.
struct InPlane {
    /// A quadrature point: ions of one slope and polar angle, with a spectrum of energies.
    struct Node {
        int bin = 0;
        double slope = 0;
        double cos_polar = 1;
        double weight = 0; ///< share of the flux
        int spectrum = 0;
    };
    struct EnergyShare {
        double energy_ev = 0;
        double share = 0; ///< of the spectrum, sum 1
    };

    std::vector<double> angle;  ///< edges [rad], strictly increasing, within [-pi/2, pi/2]
    std::vector<double> share;  ///< at the edges: flux at smaller angles, 0 to 1
    std::vector<double> moment; ///< at the edges: integral of the slope over that flux
    std::vector<Node> nodes;    ///< ordered by bin
    std::vector<std::vector<EnergyShare>> spectra;

    /// Bin that holds phi and the part of the bin below it, clamped to the ends.
    struct Place {
        int bin = 0;
        double part = 0;
    };
    Place place(double phi) const;
    /// Flux at angles below phi, and the integral of the slope over it.
    struct Below {
        double share = 0, moment = 0;
    };
    Below below(double phi) const;
    double share_below(double phi) const { return below(phi).share; }
    double moment_below(double phi) const { return below(phi).moment; }
};

InPlane resolve_in_plane(const IonLaw&);

} // namespace rille::fluxes
