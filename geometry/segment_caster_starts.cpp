// SPDX-License-Identifier: Apache-2.0
#include "geometry/segment_caster.hpp"

#include <algorithm>
#include <cmath>
#include <limits>

namespace rille::geometry {

namespace {

constexpr double blocked = std::numeric_limits<double>::infinity();
constexpr int far_room = 3; ///< [cells] rooms further in front are not looked for
// Rays that leave the cells beside the element before they reach the room go cell by cell.
constexpr int beside = 2;
constexpr std::size_t crowd = 256; ///< more elements beside one are not worth the comparisons

/// A point as a segment sees it, both lengths times the length of the segment.
struct Sight {
    double along; ///< from the start of the segment
    double height;
};

} // namespace

void SegmentCaster::find_starts(const std::vector<std::vector<int>>& lists) {
    for (int e = 0; e < static_cast<int>(ends_.size()); ++e)
        starts_.push_back(start_of(e, lists));
}

SegmentCaster::Start SegmentCaster::start_of(int element,
                                             const std::vector<std::vector<int>>& lists) const {
    const auto& own = ends_[element];
    const double sx = own[2] - own[0], sz = own[3] - own[1];
    const Start none{sx, sz, {blocked, blocked}, 0};
    const bool aside = std::fabs(sz) > std::fabs(sx); // the room lies left or right of the segment
    const bool ahead = aside ? sz < 0 : sx > 0;       // at larger x or z
    const auto cell_x = [&](double x) { return column((x - x_min_) * per_cell_x_); };
    const auto cell_z = [&](double z) { return row((z - z_min_) * per_cell_z_); };
    int ix = cell_x(own[0] + 0.5 * sx), iz = cell_z(own[1] + 0.5 * sz), content = 0;
    for (int n = 0; n < far_room && content >= 0; ++n) {
        (aside ? ix : iz) += ahead ? 1 : -1;
        if (ix < 0 || ix >= nx_ || iz < 0 || iz >= nz_) return none;
        content = content_[iz * nx_ + ix];
    }
    if (content >= 0) return none;
    const Rectangle& room = rooms_[-1 - content].cells;

    // What a ray can meet before it passes the gate, the part of the room's edge in front.
    const double pad_x = cell_pad * cell_x_, pad_z = cell_pad * cell_z_;
    Rectangle between{
        {cell_x(std::min(own[0], own[2]) - pad_x), cell_x(std::max(own[0], own[2]) + pad_x)},
        {cell_z(std::min(own[1], own[3]) - pad_z), cell_z(std::max(own[1], own[3]) + pad_z)}};
    auto &across = aside ? between.x : between.z, &wall = aside ? between.z : between.x;
    across[ahead] = (aside ? room.x : room.z)[!ahead] + (ahead ? -1 : 1);
    wall = {std::max(wall[0] - beside, 0), std::min(wall[1] + beside, (aside ? nz_ : nx_) - 1)};
    Start start{sx, sz, {0, 0}, -1 - content};
    std::size_t met = 0;
    for (int z = between.z[0]; z <= between.z[1]; ++z)
        for (int x = between.x[0]; x <= between.x[1]; ++x) {
            const std::vector<int>& list = lists[static_cast<std::size_t>(z) * nx_ + x];
            if ((met += list.size()) > crowd) return none;
            for (const int other : list)
                if (other != element) raise_over(start, element, other);
        }
    Rectangle gate = room;
    auto& opening = aside ? gate.z : gate.x;
    opening = {std::max(opening[0], wall[0]), std::min(opening[1], wall[1])};
    return opening[0] <= opening[1] && aim_at_gate(start, element, gate, aside, ahead) ? start
                                                                                       : none;
}

/// Raises the skyline of `element` over another one.
void SegmentCaster::raise_over(Start& start, int element, int other) const {
    const auto &own = ends_[element], &seen = ends_[other];
    const double square = start.along_x * start.along_x + start.along_z * start.along_z;
    std::array<Sight, 2> ends;
    for (int end = 0; end < 2; ++end) {
        const double x = seen[2 * end] - own[0], z = seen[2 * end + 1] - own[1];
        ends[end] = {start.along_x * x + start.along_z * z, start.along_x * z - start.along_z * x};
    }
    if (ends[0].height <= 0 && ends[1].height <= 0) return;
    // Only the part above the line of the element can be met.
    for (int end = 0; end < 2; ++end) {
        Sight &low = ends[end], high = ends[1 - end];
        if (low.height < 0 && high.height > 0)
            low = {low.along + low.height / (low.height - high.height) * (high.along - low.along),
                   0};
    }
    const bool before = std::max(ends[0].along, ends[1].along) <= 0;
    const bool after = std::min(ends[0].along, ends[1].along) >= square;
    if (!before && !after) start.skyline = {blocked, blocked};
    for (const Sight& at : ends) {
        if (at.height <= 0) continue;
        const double apart = before ? -at.along : at.along - square; // from the nearer end
        double& skyline = start.skyline[after];
        skyline = std::max(skyline, apart > 0 ? at.height / apart : blocked);
    }
}

/// Raises the skyline of `element` so that rays pass a gate: the edge of `room` that lies in front,
/// `aside` or above or below. False if the element does not face it.
bool SegmentCaster::aim_at_gate(Start& start, int element, const Rectangle& cells, bool aside,
                                bool ahead) const {
    const auto& own = ends_[element];
    const Room gate = room(cells);
    const double square = start.along_x * start.along_x + start.along_z * start.along_z;
    const double edge = (aside ? gate.x : gate.z)[!ahead];
    for (int end = 0; end < 2; ++end) {
        const double at = own[2 * end + !aside];
        if (ahead ? at >= edge : at <= edge) return false;
    }
    for (int end = 0; end < 2; ++end) {
        // Walking along the segment the room lies on the left.
        const bool high = aside ? ahead == (end == 0) : ahead == (end == 1);
        const double x = (aside ? edge : gate.x[high]) - own[0];
        const double z = (aside ? gate.z[high] : edge) - own[1];
        const Sight at{start.along_x * x + start.along_z * z,
                       start.along_x * z - start.along_z * x};
        const double apart = end == 0 ? -at.along : at.along - square;
        if (apart <= 0) return false;
        start.skyline[end] = std::max(start.skyline[end], at.height / apart);
    }
    return true;
}

/// Normal (not unit) of the segment at one end of `element`; at a mirror side its own image.
std::array<double, 2> SegmentCaster::normal_beyond(int element, int end) const {
    const int other = joined_[element][end];
    const auto& s = ends_[other < 0 ? element : other];
    return {other < 0 ? s[3] - s[1] : s[1] - s[3], s[2] - s[0]};
}

/// True where the segment beyond rises in front of `element`.
bool SegmentCaster::concave_at(int element, int end) const {
    const auto& own = ends_[element];
    const std::array<double, 2> n = normal_beyond(element, end);
    const double turn = (own[2] - own[0]) * -n[0] - (own[3] - own[1]) * n[1];
    return end == 1 ? turn > 0 : turn < 0;
}

/// A ray that starts, to round-off, in a concave joint and points into the other segment ends
/// there. Which of the two segments its line crosses is then a matter of the last bit.
bool SegmentCaster::starts_in_joint(const Vec3& origin, const Vec3& direction, int from,
                                    Hit& hit) const {
    const auto& own = ends_[from];
    for (int end = 0; end < 2; ++end) {
        if (std::fabs(own[2 * end] - origin.x) + std::fabs(own[2 * end + 1] - origin.z) > slack_)
            continue;
        const std::array<double, 2> n = normal_beyond(from, end);
        if (!concave_[from][end] || n[0] * direction.x + n[1] * direction.z >= 0) continue;
        const bool image = joined_[from][end] < 0;
        hit.kind = Hit::Kind::surface;
        hit.element = image ? from : joined_[from][end];
        hit.point = origin;
        hit.direction = direction;
        if (image) hit.direction.x = -direction.x;
        return true;
    }
    return false;
}

} // namespace rille::geometry
