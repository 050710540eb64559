// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstddef>
#include <numeric>
#include <vector>

namespace deviascope::test {

/// 0.5, 1.5, 2.5, …: numbers that all differ.
inline std::vector<double> ramp(std::size_t n_values) {
    std::vector<double> values(n_values);
    std::iota(values.begin(), values.end(), 0.5);
    return values;
}

}  // namespace deviascope::test
