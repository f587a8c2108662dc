// SPDX-License-Identifier: Apache-2.0
#include "geometry/ray_caster.hpp"

#include "geometry/quad_caster.hpp"
#include "geometry/segment_caster.hpp"

#include <array>
#include <optional>

namespace rille::geometry {

namespace {

/// Integer counters spread over cache lines, so that threads do not wait for each other.
class Counter {
public:
    void add_one() {
        // The address of a thread's own variable tells threads apart.
        thread_local const char here = 0;
        const auto page = reinterpret_cast<std::uintptr_t>(&here) >> 12;
        slots_[page % slots_.size()].value.fetch_add(1, std::memory_order_relaxed);
    }
    std::uint64_t total() const {
        std::uint64_t sum = 0;
        for (const Slot& s : slots_)
            sum += s.value.load(std::memory_order_relaxed);
        return sum;
    }

private:
    struct alignas(64) Slot {
        std::atomic<std::uint64_t> value{0};
    };
    std::array<Slot, 32> slots_;
};

} // namespace

struct RayCaster::Impl {
    double z_open;
    std::optional<SegmentCaster> segments; ///< extruded
    std::unique_ptr<QuadCaster> quads;     ///< full
    mutable Counter traced, lost;
};

RayCaster::RayCaster(const Domain& domain, const Surface& surface, double z_open)
    : impl_(std::make_unique<Impl>()) {
    impl_->z_open = z_open;
    if (domain.extruded())
        impl_->segments.emplace(domain, surface, z_open);
    else
        impl_->quads = std::make_unique<QuadCaster>(domain, surface, z_open);
}

RayCaster::~RayCaster() = default;

Hit RayCaster::trace(const Vec3& origin, const Vec3& direction, int from_element) const {
    const Hit hit = impl_->segments ? impl_->segments->trace(origin, direction, from_element)
                                    : impl_->quads->trace(origin, direction, from_element);
    impl_->traced.add_one();
    if (hit.kind == Hit::Kind::lost) impl_->lost.add_one();
    return hit;
}

double RayCaster::z_open() const {
    return impl_->z_open;
}
std::uint64_t RayCaster::traced() const {
    return impl_->traced.total();
}
std::uint64_t RayCaster::lost() const {
    return impl_->lost.total();
}

} // namespace rille::geometry
