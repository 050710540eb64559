// SPDX-License-Identifier: GPL-2.0-or-later
// JOB: what numbers a key accepts
#pragma once

#include <limits>
#include <string>

namespace deviascope {

/// Numbers that a key accepts. Infinities only where `infinite`; NaN never.
struct NumberRange {
    double low = -std::numeric_limits<double>::infinity();
    double high = std::numeric_limits<double>::infinity();
    bool low_open = false;   ///< low itself is not allowed
    bool high_open = false;  ///< high itself is not allowed
    bool infinite = false;

    bool holds(double value) const;
    /// For messages: `a number above 0 and at most 1`.
    std::string text() const;
};
NumberRange above(double low);
NumberRange at_least(double low);
NumberRange between(double low, double high);      ///< ends included
NumberRange inside(double low, double high);       ///< ends excluded
NumberRange above_up_to(double low, double high);  ///< low excluded, high included

}  // namespace deviascope
