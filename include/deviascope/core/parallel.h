// SPDX-License-Identifier: GPL-2.0-or-later
// CORE: under all stages; the only place that knows OpenMP
#pragma once

#include <cstddef>
#include <functional>

namespace deviascope {

/// Calls `body(index)` for index = 0 … n-1 on up to `threads` threads (1: inline, in order).
/// Called from inside another parallel_for it starts an inner team only if `threads` > 1.
/// The body must write only to places that belong to its index; results then cannot depend on
/// the thread count. Errors: if bodies throw, the exception of the lowest index is rethrown
/// after all running bodies have ended.
void parallel_for(std::size_t n, int threads, const std::function<void(std::size_t)>& body);

/// Calls `body(sequence, part)` for parts 0 … n_parts-1 of each sequence in that order,
/// different sequences on up to `threads` threads at once. The one furthest behind goes on
/// first, so that threads end together though the system held one up, or sequences are no
/// multiple of them. Errors: a sequence ends at what its body throws; that of the lowest
/// sequence is rethrown after all others have ended.
void parallel_sequences(std::size_t n_sequences,
                        std::size_t n_parts,
                        int threads,
                        const std::function<void(std::size_t, std::size_t)>& body);

/// Number of threads to use where the user named none: OMP_NUM_THREADS, else the processors
/// this process may use; at least 1.
int default_threads();

}  // namespace deviascope
