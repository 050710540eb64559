// SPDX-License-Identifier: GPL-2.0-or-later
// APP: on top of all stages
#pragma once

#include <filesystem>

#include "app/commands.h"
#include "app/terminal.h"
#include "deviascope/chain/chain.h"
#include "deviascope/counts/counts_file.h"
#include "deviascope/ensemble/sampler.h"
#include "deviascope/job/job.h"
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

/// catalogue -> counts: counts every survey and writes counts.h5.
/// Errors: Interrupted while catalogues are read.
CountsFile make_counts(const Job& job,
                       const InputRecord& inputs,
                       const std::filesystem::path& folder,
                       Terminal& terminal);

/// The counts.h5 of the folder where it fits the job's inputs; made where there is none.
/// Errors: OutputError where one is there that does not fit and `replace` is not given.
CountsFile obtain_counts(const Job& job,
                         const InputRecord& inputs,
                         const std::filesystem::path& folder,
                         bool replace,
                         Terminal& terminal);

/// counts -> model -> ensemble -> chain: samples the posterior into chains.h5. Errors:
/// Interrupted where a request to end came before. With `options.replace`, a chain that is
/// there gives way once all is ready for the new one, and its summary with it.
Outcome sample_into_chain(const Job& job,
                          const InputRecord& inputs,
                          const Counts& counts,
                          const std::filesystem::path& folder,
                          const CommandOptions& options,
                          Terminal& terminal);

/// chain -> summary: writes summary.json and summary.txt of a chain into the folder.
Summary summarise_into(const Chain& chain,
                       const std::filesystem::path& folder,
                       int threads,
                       Terminal& terminal);

}  // namespace deviascope
