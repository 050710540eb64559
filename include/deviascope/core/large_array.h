// SPDX-License-Identifier: GPL-2.0-or-later
// CORE: arrays of many numbers
#pragma once

#include <memory>
#include <new>
#include <utility>
#include <vector>

namespace deviascope {

/// Leaves new elements unset where std::allocator makes them zero. Whoever grows the array writes
/// every element before it is read.
template <class Value>
struct LeavesUnset : std::allocator<Value> {
    template <class Other>
    struct rebind {
        using other = LeavesUnset<Other>;
    };

    LeavesUnset() = default;
    template <class Other>
    LeavesUnset(const LeavesUnset<Other>&) noexcept {}

    template <class Element>
    void construct(Element* place) {
        ::new (static_cast<void*>(place)) Element;
    }
    template <class Element, class... Arguments>
    void construct(Element* place, Arguments&&... arguments) {
        ::new (static_cast<void*>(place)) Element(std::forward<Arguments>(arguments)...);
    }
};

/// For draws: filled row by row on many threads, each of which so touches its own pages first.
using LargeArray = std::vector<double, LeavesUnset<double>>;

}  // namespace deviascope
