// SPDX-License-Identifier: GPL-2.0-or-later
// ENSEMBLE, inside: how far it is, in words
#pragma once

#include <cstdint>
#include <limits>
#include <string>

namespace deviascope {

/// What a progress line tells; numbers that are not known yet are NaN and left out.
struct Standing {
    static constexpr double unknown = std::numeric_limits<double>::quiet_NaN();
    std::int64_t step = 0;
    bool is_warming_up = false;
    double worst_rhat = unknown;
    double effective_draws = unknown;
    double effective_draws_wanted = unknown;
    double seconds_left = unknown;
};

/// For instance
/// `step 12 400 · worst R-hat 1.04 · 2 100 of 10 000 effective draws · about 3 min left`.
std::string progress_line(const Standing& standing);

}  // namespace deviascope
