// SPDX-License-Identifier: Apache-2.0
#include "fluxes/exact_exchange.hpp"
#include "fluxes/taut_strings.hpp"
#include "fluxes/unrolled_chain.hpp"

#include <tbb/blocked_range.h>
#include <tbb/parallel_for.h>

#include <cmath>

namespace rille::fluxes {
namespace {

/// Part of the unrolled surface between two vertices as high as the highest: over such a vertex
/// nothing below sees anything beyond, so each hollow has its exchange for itself.
struct Hollow {
    int first, last; ///< vertices
};

/// Hollows deeper than nothing that hold elements which are no images.
std::vector<Hollow> hollows(const geometry::Domain& domain, const UnrolledChain& chain) {
    const double level = chain.point.front().z - 1e-6 * domain.spacing;
    std::vector<Hollow> found;
    int from = 0;
    bool own = false;
    for (int k = 1; k < static_cast<int>(chain.point.size()); ++k) {
        own = own || !chain.image[k - 1];
        if (chain.point[k].z < level && k + 1 < static_cast<int>(chain.point.size())) continue;
        if (k - from > 1 && own) found.push_back({from, k});
        from = k;
        own = false;
    }
    return found;
}

/// One appearance of a patch in a hollow, by its first and last vertex.
struct Copy {
    int patch;
    bool image;
    int from, to;
};

std::vector<Copy> copies_in(const UnrolledChain& chain, const Hollow& hollow,
                            const Patches& patches) {
    std::vector<Copy> copies;
    for (int k = hollow.first; k < hollow.last; ++k) {
        const int patch = patches.patch_of(chain.element[k]);
        const bool image = chain.image[k];
        if (copies.empty() || copies.back().patch != patch || copies.back().image != image)
            copies.push_back({patch, image, k, k});
        copies.back().to = k + 1;
    }
    return copies;
}

TautStrings strings_in(const geometry::Domain& domain, const UnrolledChain& chain,
                       const Hollow& hollow) {
    std::vector<PlanePoint> polygon(chain.point.begin() + hollow.first,
                                    chain.point.begin() + hollow.last + 1);
    const double roof = chain.point.front().z + domain.width_x();
    polygon.push_back({polygon.back().x, roof});
    polygon.push_back({polygon.front().x, roof});
    return TautStrings(std::move(polygon));
}

void add_hollow(const geometry::Domain& domain, const UnrolledChain& chain, const Hollow& hollow,
                const Patches& patches, PatchFactors& factors) {
    const std::vector<Copy> copies = copies_in(chain, hollow, patches);
    const TautStrings strings = strings_in(domain, chain, hollow);
    const std::size_t columns = patches.order().size();
    const auto row_of = [&](const Copy& own, const std::vector<double>& a,
                            const std::vector<double>& b) {
        double* row = &factors.exchange[own.patch * columns];
        for (int k = hollow.first; k < hollow.last; ++k) {
            const int v = k - hollow.first;
            double shared = 0.5 * ((a[v] - a[v + 1]) + (b[v + 1] - b[v]));
            if (k >= own.from && k < own.to) { // the string along the segment itself
                const PlanePoint &p = chain.point[k], &q = chain.point[k + 1];
                shared += std::sqrt((q.x - p.x) * (q.x - p.x) + (q.z - p.z) * (q.z - p.z));
            }
            row[patches.place_of(chain.element[k])] += shared;
        }
    };
    // A patch shows itself once where it is no image, so that rows do not meet; the strings of the
    // end that two patches share serve both where they are worked on together.
    tbb::parallel_for(tbb::blocked_range<std::size_t>(0, copies.size(), 8), [&](const auto& range) {
        int at = -1;
        std::vector<double> b;
        for (std::size_t i = range.begin(); i != range.end(); ++i) {
            const Copy& own = copies[i];
            if (own.image) continue;
            const std::vector<double> a =
                at == own.from ? std::move(b) : strings.lengths(own.from - hollow.first);
            b = strings.lengths(own.to - hollow.first);
            at = own.to;
            row_of(own, a, b);
        }
    });
}

} // namespace

PatchFactors string_factors(const geometry::Domain& domain, const geometry::Surface& surface,
                            const Patches& patches) {
    const UnrolledChain chain = unroll(domain, surface);
    PatchFactors factors;
    factors.exchange.assign(patches.size() * patches.order().size(), 0.0);
    for (const Hollow& hollow : hollows(domain, chain))
        add_hollow(domain, chain, hollow, patches, factors);
    return factors;
}

std::vector<int> string_ends(const geometry::Domain& domain, const geometry::Surface& surface,
                             std::vector<int>& order) {
    const UnrolledChain chain = unroll(domain, surface);
    const int segments = static_cast<int>(chain.element.size());
    std::vector<char> ends(segments + 1, 0); // by vertex of the unrolled chain
    for (const Hollow& hollow : hollows(domain, chain))
        ends[hollow.first] = ends[hollow.last] = 1;
    // The elements from one mirror side to the other, or from the highest vertex around.
    const bool mirror = domain.sides == geometry::Sides::mirror;
    int start = 0;
    if (mirror)
        while (chain.image[start] || surface.previous[chain.element[start]] >= 0)
            ++start;
    order.clear();
    std::vector<int> found;
    for (int k = 0; k < segments; ++k) {
        const int s = (start + k) % segments;
        if (chain.image[s]) break;
        if (ends[s]) found.push_back(static_cast<int>(order.size()));
        order.push_back(chain.element[s]);
    }
    return found;
}

} // namespace rille::fluxes
