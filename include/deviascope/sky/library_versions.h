// SPDX-License-Identifier: GPL-2.0-or-later
// core -> SKY -> catalogue
#pragma once

#include <string>

namespace deviascope {

/// Names and versions of the libraries of the sky's grid and frames, on one line.
std::string sky_library_versions();

}  // namespace deviascope
