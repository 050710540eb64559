// SPDX-License-Identifier: GPL-2.0-or-later
// model -> ENSEMBLE -> chain
#pragma once

#include <Eigen/Core>
#include <array>
#include <cstdint>
#include <optional>
#include <vector>

#include "deviascope/core/large_array.h"
#include "deviascope/core/target.h"
#include "deviascope/ensemble/options.h"

namespace deviascope {

/// Proposals tried and taken, per kernel.
struct KernelTally {
    std::array<std::int64_t, n_kernels> tried{}, taken{};
    KernelTally& operator+=(const KernelTally& other);
};

/// Stored rows: `value` has rows x replicates x walkers x parameters, the last index fastest.
struct Draws {
    Eigen::Index n_rows = 0, n_replicates = 0, n_walkers = 0, n_parameters = 0;
    LargeArray value;
    std::vector<double> log_posterior;   ///< rows x replicates x walkers
    std::vector<double> log_likelihood;  ///< rows x replicates x walkers

    double at(Eigen::Index row,
              Eigen::Index replicate,
              Eigen::Index walker,
              Eigen::Index parameter) const {
        return value[static_cast<std::size_t>(
            ((row * n_replicates + replicate) * n_walkers + walker) * n_parameters +
            parameter)];
    }
    const double* row_of(Eigen::Index row, Eigen::Index replicate, Eigen::Index walker) const {
        return value.data() +
               ((row * n_replicates + replicate) * n_walkers + walker) * n_parameters;
    }
};

/// Where the sampler stands after a step: with the stored rows, enough to go on from.
struct EnsembleState {
    std::int64_t step = 0;               ///< steps made by each walker, warm-up included
    std::int64_t look = 0;               ///< looks done since the end of the warm-up
    KernelTally tally;                   ///< since the beginning
    std::vector<double> coordinates;     ///< replicates x walkers x coordinates
    std::vector<double> log_posterior;   ///< replicates x walkers
    std::vector<double> log_likelihood;  ///< replicates x walkers
    /// Evaluations of the density since the beginning, in the target's ways; may be empty.
    std::vector<EvaluationCount> evaluations;
};

/// What is fixed at the end of the warm-up.
struct WarmUp {
    Draws buffer;                    ///< thinned rows of the warm-up, redrawn parameters NaN
    std::vector<std::int64_t> step;  ///< step of each buffered row
    bool settled = false;        ///< false: ended only because half of max_steps was used up
    std::int64_t discarded = 0;  ///< steps per walker
    std::int64_t store_every = 1;
    /// What the target offered for the independence kernel; a resumed run uses this one.
    std::optional<CoordinateGaussian> approximation;
    std::vector<std::string> warnings;  ///< of the target
};

/// Where draws go. Calls come one at a time: warm_up once, then blocks in order, from whatever
/// thread, while the sampler goes on.
class DrawSink {
  public:
    virtual ~DrawSink() = default;
    virtual void warm_up(const WarmUp& warm_up) = 0;
    /// Rows since the last block (at least one, but for the block at the end of the run), and
    /// the state at or after the last of them but before the next row. Where blocks end depends
    /// on the clock; rows do not.
    virtual void block(const Draws& rows, const EnsembleState& state) = 0;
    /// Rows that are best stored together: where the clock may choose, blocks after the first
    /// end on a multiple of this number of all rows. Asked before the first block only.
    /// @param n_rows  of the first block of the chain; 0: not known yet
    virtual std::int64_t rows_together([[maybe_unused]] Eigen::Index n_rows) const { return 1; }
};

}  // namespace deviascope
