// SPDX-License-Identifier: GPL-2.0-or-later
// APP: on top of all stages
#pragma once

#include "app/terminal.h"
#include "deviascope/chain/chain_file.h"

namespace deviascope {

/// How far a chain has come.
enum class Progressed { not_begun, in_warm_up, storing, finished };

/// The chain that a run with --resume finds.
struct StoredChain {
    Progressed progressed = Progressed::not_begun;
    Chain chain;  ///< where the file is there
};

/// Reads the chain under the lock and makes sure that it is one of this job.
/// @param own  provenance of the job as it is now
/// Errors: UsageError where job text, seed, inputs, priors or the program's version are others;
/// InputError where the file is no chain.
StoredChain find_stored_chain(const ChainLock& lock, const Provenance& own, Terminal& terminal);

}  // namespace deviascope
