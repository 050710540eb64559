// SPDX-License-Identifier: GPL-2.0-or-later
// CATALOGUE (private): what all readers agree on
#pragma once

#include <fmt/format.h>

#include <cstdint>
#include <filesystem>
#include <string>

#include "deviascope/core/error.h"

namespace deviascope {

/// Rows of a chunk: enough that nothing is paid by the chunk, few enough that some columns of
/// doubles stay in the cache.
inline constexpr std::int64_t rows_per_chunk = 16384;

/// The error of a file that the system does not let us read.
inline InputError cannot_read(const std::filesystem::path& path, const std::string& reason) {
    return InputError({path.string(),
                       fmt::format("cannot be read ({})", reason),
                       "a readable file is needed",
                       ""});
}

}  // namespace deviascope
