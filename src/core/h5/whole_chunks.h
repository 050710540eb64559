// SPDX-License-Identifier: GPL-2.0-or-later
// CORE (private to this folder): chunks that are stored as they are
#pragma once

#include "core/h5/draft_file.h"
#include "core/h5/session.h"

namespace deviascope::h5 {

/// Entries of a dataset that follow one another along its first axis.
struct Entries {
    std::size_t first = 0;
    Shape shape;                   ///< how many, and the extents of one
    const char* values = nullptr;  ///< of 8 bytes each, last axis fastest
};

/// Stores entries chunk by chunk, past the library's chunk cache and filters: the file means
/// the same, and the time goes down to that of copying.
/// @param set    of `draft`; it has room for them
/// @returns false, and stores nothing, where that is the library's work: where the entries do
/// not fill whole chunks, elements differ in memory and in the file, or a chunk is more than
/// its values and their checksum, or too large to be written at once. Errors: H5::Exception.
bool write_whole_chunks(const H5::DataSet& set, const Entries& entries, DraftFile& draft);

}  // namespace deviascope::h5
