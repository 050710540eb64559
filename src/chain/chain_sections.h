// SPDX-License-Identifier: GPL-2.0-or-later
// ensemble -> CHAIN -> summary (private): the sections of chains.h5, as they are written
#pragma once

#include "core/h5/writer.h"
#include "deviascope/chain/chain.h"

namespace deviascope {

/// What is known at the start: all of a new file. The chain's options, parameters, vectors,
/// counts and provenance are written, its draws are not.
void write_head(h5::Writer& writer,
                const Provenance& provenance,
                const std::vector<Parameter>& parameters,
                const std::vector<VectorParameter>& vectors,
                const Counts& counts,
                const EnsembleOptions& options);

/// /warm_up, and what it fixed in /state. Errors: InternalError where sizes do not fit.
void write_warm_up(h5::Writer& writer, const WarmUp& warm_up);

/// Errors: InternalError where the sizes of rows and state do not fit each other.
void ensure_block(const Draws& rows, const EnsembleState& state);
/// Rows of a chunk, at most 100, so that this many rows fill whole chunks, or nearly so.
std::int64_t good_rows_a_chunk(Eigen::Index n_rows);
/// The datasets that grow, for blocks like this one.
void create_growing(h5::Writer& writer,
                    const Draws& rows,
                    const EnsembleState& state,
                    std::int64_t rows_a_chunk);
/// Appends rows and the state after them.
void append_block(h5::Writer& writer,
                  const Draws& rows,
                  const EnsembleState& state,
                  std::int64_t n_rows_after);

void write_end(h5::Writer& writer, Outcome::End end);
void write_outcome(h5::Writer& writer, const Outcome& outcome);

}  // namespace deviascope
