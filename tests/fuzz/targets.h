// SPDX-License-Identifier: GPL-2.0-or-later
// What is fuzzed: each target gives bytes to a reader, as a file or text. A reader may refuse them
// with an Error that is no InternalError; anything else (another exception, a crash, a sanitizer's
// report) is a find.
#pragma once

#include <cstdint>
#include <span>
#include <string>
#include <vector>

namespace deviascope::fuzz {

using Bytes = std::span<const std::uint8_t>;

struct Target {
    const char* name;  ///< also of its folder in corpus/ and found/
    void (*run)(Bytes bytes);
};

/// job, csv, fits_table, hdf5_table, healpix_map, moc, counts, chain.
const std::vector<Target>& targets();

}  // namespace deviascope::fuzz
