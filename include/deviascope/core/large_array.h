// SPDX-License-Identifier: GPL-2.0-or-later
// CORE: arrays of many numbers
#pragma once

#include <cstddef>
#include <memory>
#include <new>
#include <utility>
#include <vector>

namespace deviascope {

/// Memory that the system is asked to make of its larger pages where it is long enough: they
/// are fewer to be made at the first touch, and to be looked up. Errors: std::bad_alloc.
void* large_memory(std::size_t n_bytes);
/// Gives back memory of that length from `large_memory`.
void free_large_memory(void* memory, std::size_t n_bytes) noexcept;

/// Leaves new elements unset where std::allocator makes them zero. Whoever grows the array
/// writes every element before it is read. Takes large memory.
template <class Value>
struct LeavesUnset : std::allocator<Value> {
    template <class Other>
    struct rebind {
        using other = LeavesUnset<Other>;
    };

    LeavesUnset() = default;
    template <class Other>
    LeavesUnset(const LeavesUnset<Other>&) noexcept {}

    Value* allocate(std::size_t n) {
        return static_cast<Value*>(large_memory(n * sizeof(Value)));
    }
    void deallocate(Value* place, std::size_t n) noexcept {
        free_large_memory(place, n * sizeof(Value));
    }

    template <class Element>
    void construct(Element* place) {
        ::new (static_cast<void*>(place)) Element;
    }
    template <class Element, class... Arguments>
    void construct(Element* place, Arguments&&... arguments) {
        ::new (static_cast<void*>(place)) Element(std::forward<Arguments>(arguments)...);
    }
};

/// For draws and what is made of them: filled on many threads, each of which so touches its own
/// pages first.
using LargeArray = std::vector<double, LeavesUnset<double>>;

}  // namespace deviascope
