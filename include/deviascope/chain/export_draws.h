// SPDX-License-Identifier: GPL-2.0-or-later
// ensemble -> CHAIN -> summary
#pragma once

#include <cstdint>
#include <filesystem>
#include <string>
#include <vector>

#include "deviascope/chain/chain.h"

namespace deviascope {

/// Columns of the exported table: step, replicate, walker (from 1), log_posterior,
/// log_likelihood, every parameter; then, for each vector, `<vector>.amplitude`,
/// `<vector>.l_deg`, `.b_deg` (galactic), `.ra_deg`, `.dec_deg` (ICRS), and for the velocity
/// `velocity.speed_km_s`. Angles of a vector of length zero are NaN. Units as FITS writes them;
/// velocities, in units of c, have none.
struct ExportColumn {
    std::string name, unit;
};
std::vector<ExportColumn> export_columns(const Chain& chain);

/// Writes the stored draws as a table: FITS (binary table DRAWS with job, seed and version in
/// its header), CSV with a header line (17 significant digits: the same bits when read back),
/// or CSV in gzip, by the ending of the name: `.fits`, `.csv`, `.csv.gz`. The same chain gives
/// the same bytes.
/// @param thin  every how many stored rows are written, at least 1
/// @return      rows written
/// Errors: UsageError for another ending, OutputError. Threads: main thread only.
std::int64_t export_draws(const Chain& chain, const std::filesystem::path& path, int thin);

}  // namespace deviascope
