// SPDX-License-Identifier: GPL-2.0-or-later
#include "ensemble/progress_line.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "deviascope/core/grouped_number.h"

namespace deviascope {

namespace {

constexpr const char* between = " · ";
constexpr double minute = 60.0;
constexpr double hour = 3600.0;

std::int64_t whole(double number) {
    constexpr double largest = 1e15;
    return static_cast<std::int64_t>(std::clamp(number, 0.0, largest));
}

std::string duration(double seconds) {
    if (seconds < minute) return fmt::format("{} s", whole(std::ceil(seconds)));
    if (seconds < hour) return fmt::format("{} min", whole(std::round(seconds / minute)));
    return grouped(whole(seconds / hour)) +
           fmt::format(" h {} min", whole(std::fmod(seconds, hour) / minute));
}

}  // namespace

std::string progress_line(const Standing& standing) {
    std::string line = "step " + grouped(standing.step);
    if (standing.is_warming_up) line += std::string(between) + "warming up";
    if (!std::isnan(standing.worst_rhat))
        line += fmt::format("{}worst R-hat {:.2f}", between, standing.worst_rhat);
    if (!std::isnan(standing.effective_draws))
        line += between + grouped(whole(standing.effective_draws)) + " of " +
                grouped(whole(standing.effective_draws_wanted)) + " effective draws";
    if (!std::isnan(standing.seconds_left))
        line += fmt::format("{}about {} left", between, duration(standing.seconds_left));
    return line;
}

}  // namespace deviascope
