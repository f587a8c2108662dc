// SPDX-License-Identifier: Apache-2.0
#pragma once

#include "engine/picture.hpp"

#include <array>
#include <memory>
#include <string>
#include <vector>

namespace rille::engine {

/// The cross-section alone, sized for half of a laptop's screen and for a hand's width: title, the
/// final profile with CD marks over the fronts before it, the names of the films, one line of
/// caution. Arguments as of picture_svg.
std::string section_sheet(const Case&, const std::vector<PictureFront>& fronts,
                          const SurfaceState& last, const Metrics&);

/// The cross-section at many times in one drawing, of which one is shown: each is a group with
/// class "moment", and all but the last have display="none".
class Timeline {
public:
    /// `first` and `last` set the frame of the drawing.
    Timeline(const Case&, const SurfaceState& first, const SurfaceState& last);
    Timeline(const Timeline&) = delete;
    Timeline& operator=(const Timeline&) = delete;
    ~Timeline();

    /// The next moment; times must rise, and the last one added is the last state.
    void add(const SurfaceState&);
    std::string finish();

private:
    struct Drawing;
    std::unique_ptr<Drawing> drawing_;
};

/// Points of a line without those that lie within `tolerance` of what remains (Douglas and Peucker
/// 1973); the ends stay.
std::vector<std::array<double, 2>> thinned(const std::vector<std::array<double, 2>>& points,
                                           double tolerance);

} // namespace rille::engine
