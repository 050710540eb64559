// SPDX-License-Identifier: GPL-2.0-or-later
// ENSEMBLE, inside: rows of draws
#pragma once

#include <cstdint>

#include "deviascope/core/target.h"
#include "deviascope/ensemble/draws.h"
#include "ensemble/mover.h"

namespace deviascope {

/// Draws without rows, for this target and ensemble.
Draws empty_draws(const Target& target, const EnsembleShape& shape);

/// Adds rows, unset until they are written, or drops those behind this many.
void resize_rows(Draws& draws, Eigen::Index n_rows);
/// Room for so many rows. Address space only: pages that are never written cost nothing.
void reserve_rows(Draws& draws, Eigen::Index n_rows);

/// Bytes of one row.
std::size_t row_bytes(const Draws& draws);

/// What is done about parameters that were integrated out.
enum class Redrawn { left_nan, drawn };

/// Writes the parameters and densities of one replicate's walkers into a row that is there.
/// Redraws are keyed (seed, monopole_redraw; replicate, walker, step).
class RowWriter {
  public:
    RowWriter(const Target& target, std::uint64_t seed, const EnsembleShape& shape)
        : target_(target), seed_(seed), shape_(shape) {}

    struct Place {
        Eigen::Index replicate = 0;
        std::int64_t step = 0;
        Eigen::Index row = 0;
    };
    /// Threads: for several replicates at once.
    void write(const EnsembleState& state,
               const Place& place,
               Redrawn redrawn,
               Draws& draws) const;

  private:
    void redraw(const Place& place, Eigen::Ref<Eigen::MatrixXd> parameters) const;

    const Target& target_;
    std::uint64_t seed_;
    EnsembleShape shape_;
};

}  // namespace deviascope
