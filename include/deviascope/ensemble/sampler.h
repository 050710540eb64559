// SPDX-License-Identifier: GPL-2.0-or-later
// model -> ENSEMBLE -> chain
#pragma once

#include "deviascope/core/target.h"
#include "deviascope/ensemble/draws.h"
#include "deviascope/ensemble/options.h"

namespace deviascope {

/// How a run ended. Starts pessimistic.
struct Outcome {
    enum class End { not_run, converged, max_steps, interrupted };
    End end = End::not_run;
    std::int64_t steps = 0;      ///< per walker, warm-up included
    std::int64_t discarded = 0;  ///< per walker
    std::int64_t store_every = 0;
    std::int64_t n_rows = 0;
    bool warm_up_settled = false;
    KernelTally tally;
};

/// Samples a target: warm-up, looks and stopping rule as in DEVELOPERS.md.
///
/// Two halves, each moved using the other (Goodman & Weare 2010, CAMCoS 5, 65, parallel
/// variant), kernels drawn per walker and step: stretch (same source), differential-evolution
/// (ter Braak 2006, Stat. Comput. 16, 239). Random numbers keyed (seed, moves; replicate,
/// walker, step). Errors: UsageError (options), NumericalError (no finite starting point for a
/// walker after 10,000 attempts; log density NaN: names the coordinates). Threads: main thread;
/// works on `options.threads`, and the sink on one more. Same bits for any number.
Outcome sample(const Target& target, const EnsembleOptions& options, DrawSink& sink);

/// What a run that did not come to its end has stored; enough to go on from.
struct StoredRun {
    WarmUp warm_up;
    Draws draws;          ///< all rows, at least one
    EnsembleState state;  ///< after the last block
};

/// Goes on where a stored run stands, and ends as `sample` would have: same rows, same
/// decisions, same bits, for any number of threads. The sink receives the blocks that follow.
/// @param options  those of the stored run, apart from what never changes a bit
/// Errors: as `sample`; InputError where sizes or steps do not fit the target, the options or
/// each other.
Outcome resume_sampling(const Target& target,
                        const EnsembleOptions& options,
                        StoredRun stored,
                        DrawSink& sink);

}  // namespace deviascope
