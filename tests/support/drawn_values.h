// SPDX-License-Identifier: GPL-2.0-or-later
// Independent draws of a scalar, each from a stream of its own.
#pragma once

#include <cstdint>
#include <vector>

#include "deviascope/core/random.h"

namespace deviascope::test {

/// @param number  tells the sets of draws of one seed apart
/// @param draw    a value from a stream
template <class Draw>
std::vector<double> drawn_values(std::uint64_t seed,
                                 std::uint64_t number,
                                 std::size_t n_draws,
                                 const Draw& draw) {
    std::vector<double> values(n_draws);
    for (std::size_t at = 0; at < n_draws; ++at) {
        Stream stream(seed, Purpose::test, number, at, 5);
        values[at] = draw(stream);
    }
    return values;
}

}  // namespace deviascope::test
