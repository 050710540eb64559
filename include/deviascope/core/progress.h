// SPDX-License-Identifier: GPL-2.0-or-later
// CORE: under all stages
#pragma once

#include <functional>
#include <string>

namespace deviascope {

/// Where a long task says how far it is: called now and then, from the main thread, with one
/// complete plain line. The library never prints; the program throttles and shows. May be
/// empty.
using Progress = std::function<void(const std::string& line)>;

}  // namespace deviascope
