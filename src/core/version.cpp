// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/core/version.h"

namespace deviascope {

std::string version() {
    return DEVIASCOPE_VERSION;
}

}  // namespace deviascope
