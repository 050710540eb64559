// SPDX-License-Identifier: GPL-2.0-or-later
// ENSEMBLE, inside: where walkers start
#pragma once

#include "deviascope/core/target.h"
#include "deviascope/ensemble/draws.h"
#include "deviascope/ensemble/options.h"
#include "ensemble/mover.h"

namespace deviascope {

/// Attempts a walker gets to start where the log posterior is finite.
inline constexpr int most_start_attempts = 10'000;

/// Every walker at the first attempt of the target with a finite log posterior; numbers keyed
/// (seed, start; replicate, walker, attempt).
/// Errors: NumericalError where no attempt is finite, or a log density is NaN or +inf.
EnsembleState starting_state(const Target& target,
                             const EnsembleOptions& options,
                             const EnsembleShape& shape);

}  // namespace deviascope
