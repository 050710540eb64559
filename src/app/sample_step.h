// SPDX-License-Identifier: GPL-2.0-or-later
// APP: on top of all stages
#pragma once

#include "app/commands.h"
#include "app/stored_chain.h"
#include "app/terminal.h"
#include "deviascope/ensemble/sampler.h"
#include "deviascope/job/job.h"

namespace deviascope {

/// What sampling a job's posterior into a chain takes.
struct SampleStep {
    const Job& job;
    const Counts& counts;
    const Provenance& provenance;
    ChainLock lock;  ///< on the chain to write
    const CommandOptions& options;
};

/// counts -> model -> ensemble -> chain: samples anew, or goes on with what is stored, or (the
/// chain is finished) does nothing. With `options.replace`, a chain that is there gives way
/// once all is ready for the new one, and its summary with it. Where the run was interrupted, a
/// note says how to go on. Errors: Interrupted where a request to end came before sampling.
Outcome sample_into_chain(const SampleStep& step, StoredChain stored, Terminal& terminal);

}  // namespace deviascope
