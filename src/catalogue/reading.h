// SPDX-License-Identifier: GPL-2.0-or-later
// CATALOGUE (private): what all readers agree on
#pragma once

#include <cstdint>

namespace deviascope {

/// Rows of a chunk: enough that nothing is paid by the chunk, few enough that some columns of
/// doubles stay in the cache.
inline constexpr std::int64_t rows_per_chunk = 16384;

}  // namespace deviascope
