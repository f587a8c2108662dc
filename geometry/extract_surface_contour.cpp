// SPDX-License-Identifier: Apache-2.0
#include "geometry/contour.hpp"
#include "geometry/extract_surface.hpp"

#include <algorithm>
#include <cmath>

namespace rille::geometry {

namespace {

constexpr double shortest_segment = 0.15; ///< [cells]

/// A segment inside the period, with the number of periods it was moved by to get there.
struct Piece {
    Vec3 a, b;
    int period = 0;
    bool enters = false; ///< a lies on the left side of the period, the walk comes from outside
};

/// A loop of a periodic domain, cut wherever it crosses a side and moved into the period.
std::vector<Piece> cut_at_sides(const ContourChain& chain, const Domain& domain) {
    const double width = domain.width_x(), x_min = domain.x_min(), x_max = x_min + width;
    const auto period_of = [&](double x) {
        return static_cast<int>(std::floor((x - x_min) / width));
    };
    const auto inside = [&](Vec3 p, int period) {
        p.x = std::clamp(p.x - period * width, x_min, x_max);
        return p;
    };
    const int size = static_cast<int>(chain.points.size());
    const int periods = static_cast<int>(std::lround(chain.shift / width));
    std::vector<Piece> pieces;
    for (int n = 0; n < size; ++n) {
        const Vec3 a = chain.points[n].p;
        const Vec3 ahead = chain.points[(n + 1) % size].p;
        const Vec3 b = n + 1 < size ? ahead : ahead + Vec3(chain.shift, 0, 0);
        int here = period_of(a.x);
        const int there = period_of(ahead.x) + (n + 1 < size ? 0 : periods);
        Vec3 from = inside(a, here);
        while (here != there) {
            const bool right = there > here;
            const double side = x_min + width * (right ? here + 1 : here);
            const double z = a.z + (side - a.x) / (b.x - a.x) * (b.z - a.z);
            const Vec3 end(right ? x_max : x_min, 0, z);
            if ((end - from).length() > 0) pieces.push_back({from, end, here, false});
            from = Vec3(right ? x_min : x_max, 0, z);
            here += right ? 1 : -1;
        }
        const Vec3 end = inside(ahead, period_of(ahead.x));
        if ((end - from).length() > 0) pieces.push_back({from, end, here, false});
    }
    for (std::size_t n = 0; n < pieces.size(); ++n)
        pieces[n].enters = n > 0 ? pieces[n].period == pieces[n - 1].period + 1
                                 : pieces[0].period + periods == pieces.back().period + 1;
    return pieces;
}

/// Starts a loop that enters the period with its uppermost entry.
void start_at_side(std::vector<Piece>& pieces) {
    int start = -1;
    for (int n = 0; n < static_cast<int>(pieces.size()); ++n)
        if (pieces[n].enters && (start < 0 || pieces[n].a.z > pieces[start].a.z)) start = n;
    if (start > 0) std::rotate(pieces.begin(), pieces.begin() + start, pieces.end());
}

void add_open(Surface& s, const ContourChain& chain, int number, bool revolved) {
    const int size = static_cast<int>(chain.points.size()) - 1;
    for (int n = 0; n <= size; ++n) {
        s.vertices.push_back(chain.points[n].p);
        if (n == 0) continue;
        const int end = static_cast<int>(s.vertices.size()) - 1;
        const int e = static_cast<int>(s.size());
        add_element(s, {end - 1, end, -1, -1}, number, revolved);
        s.previous.push_back(n > 1 ? e - 1 : -1);
        s.next.push_back(n < size ? e + 1 : -1);
    }
}

void add_loop(Surface& s, const std::vector<Piece>& pieces, int number, bool revolved) {
    const int first = static_cast<int>(s.size()), size = static_cast<int>(pieces.size());
    const auto add_vertex = [&](const Vec3& p) {
        s.vertices.push_back(p);
        return static_cast<int>(s.vertices.size()) - 1;
    };
    int end = -1;
    for (int n = 0; n < size; ++n) {
        const bool joined = n > 0 && pieces[n - 1].b == pieces[n].a;
        const int start = joined ? end : add_vertex(pieces[n].a);
        const bool closes = n + 1 == size && n > 0 && pieces[n].b == pieces[0].a;
        end = closes ? s.corners[first][0] : add_vertex(pieces[n].b);
        add_element(s, {start, end, -1, -1}, number, revolved);
        s.previous.push_back(first + (n + size - 1) % size);
        s.next.push_back(first + (n + 1) % size);
    }
}

/// The chain open to the source: of those that run from the left side of the period to the right
/// one, with the gas above, the uppermost. -1 if there is none.
int open_chain(const std::vector<ContourChain>& chains, const Domain& domain) {
    int best = -1;
    double best_z = 0;
    for (int n = 0; n < static_cast<int>(chains.size()); ++n) {
        const auto& c = chains[n];
        const double run = c.closed ? c.shift : c.points.back().p.x - c.points.front().p.x;
        if (run < 0.5 * domain.width_x()) continue;
        double z = c.points.front().p.z;
        if (c.closed)
            for (const Piece& piece : cut_at_sides(c, domain))
                if (piece.enters) z = std::max(z, piece.a.z);
        if (best < 0 || z > best_z) {
            best = n;
            best_z = z;
        }
    }
    return best;
}

/// A bubble or crumb on the axis so small that no point of its outline is left but the two ends.
bool lies_on_axis(const ContourChain& chain) {
    return std::all_of(chain.points.begin(), chain.points.end(),
                       [](const ContourPoint& q) { return q.p.x == 0; });
}

} // namespace

Surface extract_contour(const Band& band) {
    const Domain& domain = band.domain;
    std::vector<ContourChain> chains = contour_chains(band);
    for (ContourChain& chain : chains) {
        rebuild_corners(chain, domain);
        merge_slivers(chain, shortest_segment * domain.spacing);
    }
    if (domain.revolved())
        chains.erase(std::remove_if(chains.begin(), chains.end(), lies_on_axis), chains.end());
    const int open = open_chain(chains, domain);
    if (open > 0) std::rotate(chains.begin(), chains.begin() + open, chains.begin() + open + 1);
    Surface s;
    int number = open < 0 ? 1 : 0;
    for (const ContourChain& chain : chains) {
        if (chain.closed) {
            std::vector<Piece> pieces = cut_at_sides(chain, domain);
            start_at_side(pieces);
            add_loop(s, pieces, number++, domain.revolved());
        } else {
            add_open(s, chain, number++, domain.revolved());
        }
    }
    return s;
}

} // namespace rille::geometry
