// SPDX-License-Identifier: GPL-2.0-or-later
// ENSEMBLE, inside: how many steps to make before coming up for air
#pragma once

#include <algorithm>
#include <chrono>
#include <cstdint>

namespace deviascope {

/// Seconds since some moment, never going back.
inline double seconds_now() {
    const auto now = std::chrono::steady_clock::now().time_since_epoch();
    return std::chrono::duration<double>(now).count();
}

/// Sizes legs of steps so that each takes about `seconds_per_leg`: often enough to answer an
/// interrupt and show progress. The clock decides only where legs end, and nothing depends on
/// that.
class Pace {
  public:
    static constexpr double seconds_per_leg = 0.2;

    std::int64_t steps() const { return steps_; }
    void took(std::int64_t n_steps, double seconds) {
        constexpr double shortest = 1e-9;
        constexpr std::int64_t fastest_growth = 4;
        const double rate = static_cast<double>(n_steps) / std::max(seconds, shortest);
        const double wanted =
            std::min(rate * seconds_per_leg, static_cast<double>(fastest_growth * steps_));
        steps_ = std::max<std::int64_t>(1, static_cast<std::int64_t>(wanted));
    }

  private:
    std::int64_t steps_ = 1;
};

}  // namespace deviascope
