// SPDX-License-Identifier: Apache-2.0
// Private to geometry: large arrays of numbers that are written in parallel before they are read.
#pragma once

#include <memory>
#include <type_traits>
#include <utility>
#include <vector>

namespace rille::geometry {

/// Leaves new elements unset where no value is given: filling 100 MB with zeros on one thread takes
/// as long as a sweep over the band on all of them.
template <class T>
struct RawAllocator : std::allocator<T> {
    static_assert(std::is_trivially_destructible<T>::value, "only for plain values");
    template <class U>
    struct rebind {
        using other = RawAllocator<U>;
    };
    RawAllocator() = default;
    template <class U>
    RawAllocator(const RawAllocator<U>&) noexcept {}
    template <class U>
    void construct(U*) noexcept {}
    template <class U, class First, class... Rest>
    void construct(U* at, First&& first, Rest&&... rest) {
        ::new (static_cast<void*>(at)) U(std::forward<First>(first), std::forward<Rest>(rest)...);
    }
};

/// A vector whose resize(n) and constructor of a size leave what is new unset.
template <class T>
using RawVector = std::vector<T, RawAllocator<T>>;

} // namespace rille::geometry
