// SPDX-License-Identifier: GPL-2.0-or-later
// CORE: under all stages
#pragma once

#include <string>

namespace deviascope {

/// Version of the program, "major.minor.patch".
std::string version();

}  // namespace deviascope
