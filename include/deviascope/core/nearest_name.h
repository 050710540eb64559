// SPDX-License-Identifier: GPL-2.0-or-later
// CORE: under all stages
#pragma once

#include <string>
#include <string_view>
#include <vector>

namespace deviascope {

/// The known name that is closest to what a user wrote, for "did you mean" remedies.
/// Distance: optimal string alignment (insert, delete, replace, swap neighbours), ASCII case
/// ignored; the first of equals wins.
/// @return empty where nothing is within a third of the length (at least 1).
std::string nearest_name(std::string_view written, const std::vector<std::string>& known);

}  // namespace deviascope
