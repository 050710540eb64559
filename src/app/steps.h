// SPDX-License-Identifier: GPL-2.0-or-later
// APP: on top of all stages
#pragma once

#include <filesystem>

#include "app/output_folder.h"
#include "app/terminal.h"
#include "deviascope/chain/chain.h"
#include "deviascope/counts/counts_file.h"
#include "deviascope/job/job.h"
#include "deviascope/model/parameter_space.h"
#include "deviascope/summary/summary.h"

namespace deviascope {

/// The arrows of the flow, as commands share them. Each says what it did in a few plain lines.

/// A job's inputs: digests of every file, and the digest that its counts carry.
struct InputRecord {
    std::vector<InputDigest> files;
    std::string counts_digest;
};
/// Errors: Interrupted while files are read.
InputRecord record_inputs(const Job& job, Terminal& terminal);

/// Readers of long files ask nobody whether to go on; where they tell how far they are, a
/// request to end can be heard: the progress throws Interrupted.
Progress ending_on_request(Progress show);

/// catalogue -> counts: counts every survey; writes nothing.
/// Errors: Interrupted while catalogues are read.
Counts count_surveys(const Job& job, Terminal& terminal);

/// What is suspicious about the inputs; returns how many warnings it gave.
std::size_t warn_of_counts(const Counts& counts, Terminal& terminal);

/// The same, and vectors whose prior is narrower than the noise of the counts.
std::size_t warn_of_counts_and_priors(const Counts& counts,
                                      const ParameterSpace& space,
                                      Terminal& terminal);

/// catalogue -> counts: counts every survey, warns, and writes counts.h5.
/// Errors: Interrupted while catalogues are read.
CountsFile make_counts(const Job& job,
                       const InputRecord& inputs,
                       const std::filesystem::path& folder,
                       Terminal& terminal);

/// The counts.h5 of the folder where it fits the job's inputs; made where there is none.
/// Errors: where one is there that does not fit, and is not to be replaced: OutputError, or
/// UsageError where it was to be kept.
CountsFile obtain_counts(const Job& job,
                         const InputRecord& inputs,
                         const std::filesystem::path& folder,
                         Existing existing,
                         Terminal& terminal);

/// UTC, ISO 8601.
std::string time_now();

/// Where a chain of this job comes from, begun now.
Provenance provenance_of(const Job& job, const InputRecord& inputs);

/// chain -> summary: writes summary.json and summary.txt of a chain into the folder.
Summary summarise_into(const Chain& chain,
                       const std::filesystem::path& folder,
                       int threads,
                       Terminal& terminal);

}  // namespace deviascope
