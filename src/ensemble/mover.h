// SPDX-License-Identifier: GPL-2.0-or-later
// ENSEMBLE, inside: moves all walkers of all replicates, step by step
#pragma once

#include <cstdint>
#include <functional>
#include <optional>
#include <vector>

#include "deviascope/core/target.h"
#include "deviascope/ensemble/draws.h"
#include "deviascope/ensemble/options.h"
#include "ensemble/kernels.h"

namespace deviascope {

/// Sizes of an ensemble.
struct EnsembleShape {
    Eigen::Index n_replicates = 0;
    Eigen::Index n_walkers = 0;  ///< per replicate
    Eigen::Index n_coordinates = 0;
};

/// Where walker (replicate, walker) keeps its coordinates, and its place in log_posterior.
std::size_t walker_index(const EnsembleShape& shape,
                         Eigen::Index replicate,
                         Eigen::Index walker);

/// Called after a replicate has made a step, perhaps on several threads at once, each with a
/// replicate of its own; the state of that replicate is then that after the step.
using AfterStep = std::function<void(Eigen::Index replicate, std::int64_t step)>;

/// One step: every walker of the first half moves using the second half, then every walker of
/// the second using the moved first. Every number is keyed (seed, moves; replicate, walker,
/// step), so neither threads nor where a call begins and ends can change a bit.
class Mover {
  public:
    /// @param approximation  what the independence kernel draws from; may be null
    Mover(const Target& target,
          const EnsembleOptions& options,
          const EnsembleShape& shape,
          const CoordinateGaussian* approximation);

    /// Moves all replicates by n_steps. Errors: NumericalError where a log density is NaN or
    /// +inf.
    void advance(EnsembleState& state, std::int64_t n_steps, const AfterStep& after_step);

  private:
    /// Room for the proposals of one block of walkers; used by one thread at a time.
    struct Block {
        Eigen::Index first = 0;  ///< within the half
        Eigen::MatrixXd proposal;
        Eigen::VectorXd log_posterior, log_likelihood;
        std::vector<double> log_factor, log_uniform;
        std::vector<Kernel> kernel;
        KernelTally tally;
    };
    struct Place {
        Eigen::Index replicate;
        Eigen::Index half;
        std::int64_t step;
    };

    void advance_replicates(EnsembleState& state, std::int64_t n_steps, const AfterStep& after);
    void advance_blocks(EnsembleState& state, std::int64_t n_steps, const AfterStep& after);
    void move(EnsembleState& state, const Place& place, Block& block) const;
    void propose_block(const EnsembleState& state, const Place& place, Block& block) const;
    void evaluate_block(const Place& place, Block& block) const;
    void accept_block(EnsembleState& state, const Place& place, Block& block) const;
    void collect_tallies(KernelTally& tally);
    Block& block_of(Eigen::Index replicate, Eigen::Index block) {
        return blocks_[static_cast<std::size_t>(replicate * n_blocks_ + block)];
    }

    const Target& target_;
    EnsembleShape shape_;
    KernelMix mix_;
    std::optional<IndependenceProposal> independence_;
    std::uint64_t seed_;
    int threads_;
    Eigen::Index n_blocks_;      ///< per half; 1 unless there are more threads than replicates
    std::vector<Block> blocks_;  ///< replicates x blocks
};

}  // namespace deviascope
