// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/case.hpp"
#include "fluxes/surface_step.hpp"

#include <map>
#include <string>
#include <vector>

namespace rille::engine {

/// A wide unmasked area of the same stack, etched at the flat-film rate: what a fab's endpoint
/// detector sees. Its depth is followed exactly through the films.
class OpenField {
public:
    explicit OpenField(const Case&);

    /// Response of a flat, unmasked surface of the run's material in the named plasma.
    const fluxes::SurfaceResponse& flat(int material, const std::string& plasma) const;
    /// Height of the flat surface [nm].
    double height() const { return height_; }
    /// Time [s] from now until the surface reaches height z under the named plasma, infinity if
    /// never.
    double time_to(double z, const std::string& plasma) const;
    void advance(double dt_s, const std::string& plasma);

    /// What changes as time goes on, for saving and reading back.
    template <class Archive, class Self>
    static void visit(Archive& archive, Self& self) {
        archive(self.height_);
        archive(self.grown_);
        archive(self.grown_material_);
    }

private:
    const std::vector<fluxes::SurfaceResponse>& responses_under(const std::string& plasma) const;

    const Case& case_;
    geometry::Stack stack_;
    double height_ = 0;
    double grown_ = 0; ///< [nm] of film on top
    int grown_material_ = -1;
    mutable std::map<std::string, std::vector<fluxes::SurfaceResponse>> known_; ///< by plasma
};

} // namespace rille::engine
