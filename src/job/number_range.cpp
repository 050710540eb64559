// SPDX-License-Identifier: GPL-2.0-or-later
#include "job/number_range.h"

#include <fmt/format.h>

#include <cmath>

namespace deviascope {

bool NumberRange::holds(double value) const {
    if (std::isnan(value) || (std::isinf(value) && !infinite)) return false;
    const bool above_low = low_open ? value > low : value >= low;
    const bool below_high = high_open ? value < high : value <= high;
    return above_low && below_high;
}

std::string NumberRange::text() const {
    std::string lower, upper;
    if (std::isfinite(low))
        lower = fmt::format(" {} {}", low_open ? "above" : "of at least", low);
    if (std::isfinite(high))
        upper = fmt::format(" {} {}", high_open ? "below" : "at most", high);
    const char* joint = lower.empty() || upper.empty() ? "" : " and";
    const bool bounded = std::isfinite(low) && std::isfinite(high);
    const char* kind = infinite ? "a number or inf" : bounded ? "a number" : "a finite number";
    return kind + lower + joint + upper;
}

NumberRange above(double low) {
    NumberRange range;
    range.low = low;
    range.low_open = true;
    return range;
}

NumberRange at_least(double low) {
    NumberRange range;
    range.low = low;
    return range;
}

NumberRange between(double low, double high) {
    NumberRange range = at_least(low);
    range.high = high;
    return range;
}

NumberRange inside(double low, double high) {
    NumberRange range = above_up_to(low, high);
    range.high_open = true;
    return range;
}

NumberRange above_up_to(double low, double high) {
    NumberRange range = above(low);
    range.high = high;
    return range;
}

}  // namespace deviascope
