// SPDX-License-Identifier: GPL-2.0-or-later
// CORE: under all stages
#pragma once

#include <cstdint>
#include <string>

namespace deviascope {

/// A whole number with its digits set apart in threes by spaces: `12 600 000`.
std::string grouped(std::int64_t number);

/// The same for the whole part of a number already written with digits, sign and point.
std::string grouped_digits(std::string digits);

}  // namespace deviascope
