// SPDX-License-Identifier: GPL-2.0-or-later
#include "ensemble/mover.h"

#include <algorithm>
#include <cmath>

#include "deviascope/core/parallel.h"
#include "deviascope/core/random.h"
#include "ensemble/finite_density.h"

namespace deviascope {

namespace {

/// Targets work on lanes of four walkers.
constexpr Eigen::Index block_multiple = 4;
/// Parts of a replicate's steps, between which threads may change places: at the end none waits
/// for longer than one of them takes.
constexpr std::int64_t most_parts = 16;

Eigen::Index blocks_per_half(int threads, const EnsembleShape& shape) {
    if (threads <= shape.n_replicates) return 1;
    const Eigen::Index wanted = (threads + shape.n_replicates - 1) / shape.n_replicates;
    const Eigen::Index half = shape.n_walkers / 2;
    return std::min(wanted, (half + block_multiple - 1) / block_multiple);
}

/// Border of a block within its half, a multiple of the lanes.
Eigen::Index border(Eigen::Index block, Eigen::Index n_blocks, Eigen::Index half) {
    const Eigen::Index n_lanes = (half + block_multiple - 1) / block_multiple;
    return std::min(half, block * n_lanes / n_blocks * block_multiple);
}

}  // namespace

std::size_t walker_index(const EnsembleShape& shape,
                         Eigen::Index replicate,
                         Eigen::Index walker) {
    return static_cast<std::size_t>(replicate * shape.n_walkers + walker);
}

Mover::Mover(const Target& target,
             const EnsembleOptions& options,
             const EnsembleShape& shape,
             const CoordinateGaussian* approximation)
    : target_(target),
      shape_(shape),
      mix_(options.kernels, approximation != nullptr),
      seed_(options.seed),
      threads_(options.threads),
      n_blocks_(blocks_per_half(options.threads, shape)),
      blocks_(static_cast<std::size_t>(shape.n_replicates * n_blocks_)) {
    if (approximation != nullptr) independence_.emplace(*approximation);
    const Eigen::Index half = shape.n_walkers / 2;
    for (Eigen::Index replicate = 0; replicate < shape.n_replicates; ++replicate) {
        for (Eigen::Index index = 0; index < n_blocks_; ++index) {
            Block& block = block_of(replicate, index);
            block.first = border(index, n_blocks_, half);
            const Eigen::Index size = border(index + 1, n_blocks_, half) - block.first;
            block.proposal.resize(shape.n_coordinates, size);
            block.log_posterior.resize(size);
            block.log_likelihood.resize(size);
            block.log_factor.resize(static_cast<std::size_t>(size));
            block.log_uniform.resize(static_cast<std::size_t>(size));
            block.kernel.resize(static_cast<std::size_t>(size));
        }
    }
}

void Mover::advance(EnsembleState& state, std::int64_t n_steps, const AfterStep& after_step) {
    if (n_blocks_ == 1)
        advance_replicates(state, n_steps, after_step);
    else
        advance_blocks(state, n_steps, after_step);
    state.step += n_steps;
    collect_tallies(state.tally);
}

void Mover::advance_replicates(EnsembleState& state,
                               std::int64_t n_steps,
                               const AfterStep& after) {
    const auto n_replicates = static_cast<std::size_t>(shape_.n_replicates);
    const std::int64_t n_parts = std::min(n_steps, most_parts);
    parallel_sequences(
        n_replicates,
        static_cast<std::size_t>(n_parts),
        threads_,
        [&](std::size_t index, std::size_t part_index) {
            const auto replicate = static_cast<Eigen::Index>(index);
            const auto part = static_cast<std::int64_t>(part_index);
            Block& block = block_of(replicate, 0);
            const std::int64_t last = state.step + n_steps * (part + 1) / n_parts;
            for (std::int64_t step = state.step + n_steps * part / n_parts + 1; step <= last;
                 ++step) {
                for (const Eigen::Index half : {0, 1})
                    move(state, {replicate, half, step}, block);
                after(replicate, step);
            }
        });
}

void Mover::advance_blocks(EnsembleState& state, std::int64_t n_steps, const AfterStep& after) {
    const auto n_replicates = static_cast<std::size_t>(shape_.n_replicates);
    for (std::int64_t step = state.step + 1; step <= state.step + n_steps; ++step) {
        for (const Eigen::Index half : {0, 1})
            parallel_for(blocks_.size(), threads_, [&](std::size_t index) {
                const Eigen::Index replicate = static_cast<Eigen::Index>(index) / n_blocks_;
                move(state, {replicate, half, step}, blocks_[index]);
            });
        parallel_for(n_replicates, threads_, [&](std::size_t index) {
            after(static_cast<Eigen::Index>(index), step);
        });
    }
}

void Mover::move(EnsembleState& state, const Place& place, Block& block) const {
    propose_block(state, place, block);
    evaluate_block(place, block);
    accept_block(state, place, block);
}

void Mover::propose_block(const EnsembleState& state, const Place& place, Block& block) const {
    const Eigen::Index half_size = shape_.n_walkers / 2;
    const auto n = static_cast<std::size_t>(shape_.n_coordinates);
    const double* coordinates = state.coordinates.data();
    const std::size_t other =
        walker_index(shape_, place.replicate, (1 - place.half) * half_size);
    const Partners partners{coordinates + other * n, static_cast<std::size_t>(half_size), n};
    for (Eigen::Index column = 0; column < block.proposal.cols(); ++column) {
        const Eigen::Index walker = place.half * half_size + block.first + column;
        const std::size_t index = walker_index(shape_, place.replicate, walker);
        Stream stream(seed_,
                      Purpose::moves,
                      static_cast<std::uint64_t>(place.replicate),
                      static_cast<std::uint64_t>(walker),
                      static_cast<std::uint64_t>(place.step));
        const Proposal proposal =
            propose(mix_,
                    coordinates + index * n,
                    partners,
                    independence_ ? &*independence_ : nullptr,
                    stream,
                    block.proposal.data() + column * shape_.n_coordinates);
        const auto at = static_cast<std::size_t>(column);
        block.kernel[at] = proposal.kernel;
        block.log_factor[at] = proposal.log_factor;
        block.log_uniform[at] = std::log(uniform(stream));
    }
}

void Mover::evaluate_block(const Place& place, Block& block) const {
    target_.log_density(block.proposal, block.log_posterior, block.log_likelihood);
    const Eigen::Index first = place.half * (shape_.n_walkers / 2) + block.first;
    for (Eigen::Index column = 0; column < block.proposal.cols(); ++column)
        require_density(target_,
                        {place.replicate, first + column, "step", place.step},
                        block.proposal.col(column),
                        block.log_posterior[column],
                        block.log_likelihood[column]);
}

void Mover::accept_block(EnsembleState& state, const Place& place, Block& block) const {
    const auto n = static_cast<std::size_t>(shape_.n_coordinates);
    const Eigen::Index first = place.half * (shape_.n_walkers / 2) + block.first;
    for (Eigen::Index column = 0; column < block.proposal.cols(); ++column) {
        const auto at = static_cast<std::size_t>(column);
        const auto kernel = static_cast<std::size_t>(block.kernel[at]);
        ++block.tally.tried[kernel];
        const std::size_t index = walker_index(shape_, place.replicate, first + column);
        const double log_ratio =
            block.log_factor[at] + block.log_posterior[column] - state.log_posterior[index];
        if (!(block.log_uniform[at] < log_ratio)) continue;
        ++block.tally.taken[kernel];
        const double* moved = block.proposal.data() + column * shape_.n_coordinates;
        std::copy(moved, moved + n, state.coordinates.data() + index * n);
        state.log_posterior[index] = block.log_posterior[column];
        state.log_likelihood[index] = block.log_likelihood[column];
    }
}

void Mover::collect_tallies(KernelTally& tally) {
    for (Block& block : blocks_) {
        tally += block.tally;
        block.tally = {};
    }
}

}  // namespace deviascope
