// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/sky/library_versions.h"

#include <erfa.h>
#include <erfaextra.h>

namespace deviascope {

std::string sky_library_versions() {
    // HEALPix C++ does not tell its version: the one that was built with.
    return std::string("HEALPix C++ " DEVIASCOPE_HEALPIX_VERSION ", ERFA ") + eraVersion();
}

}  // namespace deviascope
