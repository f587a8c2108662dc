// SPDX-License-Identifier: Apache-2.0
#include "geometry/ray_caster.hpp"

#include "geometry/frustum_caster.hpp"
#include "geometry/quad_caster.hpp"
#include "geometry/segment_caster.hpp"

#include <tbb/cache_aligned_allocator.h>
#include <tbb/enumerable_thread_specific.h>

#include <algorithm>
#include <optional>

namespace rille::geometry {

namespace {

/// Counts of one thread, alone on its cache line; only that thread writes them.
struct alignas(64) Counts {
    std::atomic<std::uint64_t> traced{0}, lost{0};
    static void add(std::uint64_t some, std::atomic<std::uint64_t>& count) {
        count.store(count.load(std::memory_order_relaxed) + some, std::memory_order_relaxed);
    }
};
using CountsOfThreads =
    tbb::enumerable_thread_specific<Counts, tbb::cache_aligned_allocator<Counts>,
                                    tbb::ets_key_per_instance>;

} // namespace

struct RayCaster::Impl {
    double z_open;
    std::optional<SegmentCaster> segments; ///< extruded
    std::optional<FrustumCaster> frusta;   ///< revolved
    std::unique_ptr<QuadCaster> quads;     ///< full
    mutable CountsOfThreads counts;

    Hit hit(const Vec3& origin, const Vec3& direction, int from) const {
        return segments ? segments->trace(origin, direction, from)
               : frusta ? frusta->trace(origin, direction, from)
                        : quads->trace(origin, direction, from);
    }
    std::uint64_t sum(std::atomic<std::uint64_t> Counts::*count) const {
        std::uint64_t total = 0;
        for (const Counts& c : counts)
            total += (c.*count).load(std::memory_order_relaxed);
        return total;
    }
};

RayCaster::RayCaster(const Domain& domain, const Surface& surface, double z_open)
    : impl_(std::make_unique<Impl>()) {
    impl_->z_open = z_open;
    if (domain.revolved())
        impl_->frusta.emplace(domain, surface, z_open);
    else if (domain.extruded())
        impl_->segments.emplace(domain, surface, z_open);
    else
        impl_->quads = std::make_unique<QuadCaster>(domain, surface, z_open);
}

RayCaster::~RayCaster() = default;

Hit RayCaster::trace(const Vec3& origin, const Vec3& direction, int from_element) const {
    const Hit hit = impl_->hit(origin, direction, from_element);
    Counts& counts = impl_->counts.local();
    Counts::add(1, counts.traced);
    if (hit.kind == Hit::Kind::lost) Counts::add(1, counts.lost);
    return hit;
}

bool RayCaster::opens(const Vec3& origin, const Vec3& direction, int from_element) const {
    if (!impl_->frusta) return trace(origin, direction, from_element).kind == Hit::Kind::open;
    Counts::add(1, impl_->counts.local().traced);
    return impl_->frusta->opens(origin, direction, from_element);
}

void RayCaster::trace(const RayStart* rays, std::size_t count, Hit* hits) const {
    if (impl_->segments)
        impl_->segments->trace(rays, count, hits);
    else
        for (std::size_t n = 0; n < count; ++n)
            hits[n] = impl_->hit(rays[n].origin, rays[n].direction, rays[n].from_element);
    Counts& counts = impl_->counts.local();
    Counts::add(count, counts.traced);
    Counts::add(
        static_cast<std::uint64_t>(std::count_if(
            hits, hits + count, [](const Hit& hit) { return hit.kind == Hit::Kind::lost; })),
        counts.lost);
}

double RayCaster::z_open() const {
    return impl_->z_open;
}
std::uint64_t RayCaster::traced() const {
    return impl_->sum(&Counts::traced);
}
std::uint64_t RayCaster::lost() const {
    return impl_->sum(&Counts::lost);
}

} // namespace rille::geometry
