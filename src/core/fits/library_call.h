// SPDX-License-Identifier: GPL-2.0-or-later
// CORE (private): what every call of CFITSIO needs, reading or writing
#pragma once

#include <fitsio.h>

#include <filesystem>
#include <string>

#include "core/fits/fits_file.h"

namespace deviascope::fits {

inline fitsfile* raw(const Handle& handle) {
    return static_cast<fitsfile*>(handle.get());
}

/// The library's words for a failed call: status text and the first message of its stack.
std::string library_words(int status);

/// The library skips leading blanks and expands `~` even in literal names; `./` stops both.
std::string literal_name(const std::filesystem::path& path);

}  // namespace deviascope::fits
