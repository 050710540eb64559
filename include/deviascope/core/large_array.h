// SPDX-License-Identifier: GPL-2.0-or-later
// CORE: arrays of many numbers
#pragma once

#include <cstddef>
#include <memory>
#include <new>
#include <utility>
#include <vector>

namespace deviascope {

/// The system's larger pages (on x86-64), and from what length memory lies on them: in less,
/// much of the last one could be of no use.
inline constexpr std::size_t large_page_bytes = std::size_t{2} << 20U;
inline constexpr std::size_t large_from_bytes = 2 * large_page_bytes;

/// Memory, unset. From that length on it begins where a large page can, and the system is asked
/// for such: fewer have to be made at the first touch, looked up, and named to the disk.
/// Errors: std::bad_alloc.
void* large_memory(std::size_t n_bytes);
/// Gives back memory of that length from `large_memory`.
void free_large_memory(void* memory, std::size_t n_bytes) noexcept;

/// Leaves new elements unset where std::allocator makes them zero. Whoever grows the array
/// writes every element before it is read. Takes large memory.
template <class Value>
struct LeavesUnset : std::allocator<Value> {
    template <class Other>
    // NOLINTNEXTLINE(readability-identifier-naming): std::allocator_traits looks for this name
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
