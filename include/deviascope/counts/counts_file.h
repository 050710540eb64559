// SPDX-License-Identifier: GPL-2.0-or-later
// catalogue -> COUNTS -> model
#pragma once

#include <filesystem>
#include <string>

#include "deviascope/counts/count_map.h"

namespace deviascope {

/// counts.h5: the counts and the digest that says what they were made from.
struct CountsFile {
    Counts counts;
    std::string
        digest;  ///< SHA-256 of inputs and selection (`digest_of_inputs` of the job stage)
    std::string version;  ///< of the program that wrote it
};

/// Writes counts.h5 (schema 1; layout in the README) under a temporary name, then renames.
/// Errors: OutputError.
void write_counts(const std::filesystem::path& path, const CountsFile& file);

/// Errors: InputError: not ours, newer schema, damaged (sizes, ranges, unsorted pixels).
CountsFile read_counts(const std::filesystem::path& path);

}  // namespace deviascope
