// SPDX-License-Identifier: GPL-2.0-or-later
// CORE: under all stages
#pragma once

#include <array>
#include <cstdint>
#include <limits>

namespace deviascope {

/// What a random stream is for: half of its key. Numbers are a promise to users (same job, seed
/// and version: same bits); they are never changed and never used twice.
enum class Purpose : std::uint64_t {
    moves = 1,            ///< (replicate, walker, step)
    monopole_redraw = 2,  ///< (replicate, walker, step)
    predictive = 3,       ///< (replicate, walker, step)
    start = 4,            ///< (replicate, walker, attempt)
    laplace_draw = 5,     ///< (0 its own coordinates, 1 checks at the mode; draw, 0)
    prior_draw = 6,       ///< (0 medians, 1 chances of a length; draw, 0)
    mock_source = 7,      ///< (source, survey, attempt)
    bootstrap = 8,        ///< (source, survey, block of replicates)
    mock_population = 9,  ///< (0, survey, 0): total numbers
    spectral_index = 20,  ///< (source, survey, 0): where the catalogue has none
    sky_experiment = 21,  ///< (source, survey, 0)
    added_scatter = 22,   ///< (source, survey, 0)
    evidence = 30,        ///< (which estimate, draw, 0)
    comparison = 31,      ///< (0, fit, 0): seeds of the runs of a comparison
    reference_draw = 32,  ///< (0, draw, 0): of a velocity to compare with
    test = 1000           ///< tests only
};

/// A stream of 64-bit random words that is a pure function of its key and counter.
///
/// Philox4x64-10 of Random123 (Salmon, Moraes, Dror & Shaw 2011, "Parallel random numbers: as
/// easy as 1, 2, 3", SC11): key (seed, purpose), counter (i, j, k, 0, 1, 2 …), so that no
/// thread count, batch or resume can change a draw. Satisfies UniformRandomBitGenerator: use it
/// with Boost.Random distributions, one fresh stream and fresh distribution objects per key,
/// draws in a written order, never two in one expression.
class Stream {
  public:
    using result_type = std::uint64_t;

    Stream(
        std::uint64_t seed, Purpose purpose, std::uint64_t i, std::uint64_t j, std::uint64_t k);

    static constexpr result_type min() { return 0; }
    static constexpr result_type max() { return std::numeric_limits<result_type>::max(); }

    /// The next word. Period 2^66 words per stream.
    result_type operator()() {
        if (used_ == block_.size()) refill();
        return block_[used_++];
    }

  private:
    void refill();

    std::array<std::uint64_t, 2> key_;
    std::array<std::uint64_t, 4> counter_;
    std::array<std::uint64_t, 4> block_{};
    std::size_t used_ = 4;
};

/// A double in [0, 1): the top 53 bits of the next word, times 2^-53.
double uniform(Stream& stream);

/// A standard normal variate (Boost.Random normal_distribution, fresh for each call).
double normal(Stream& stream);

}  // namespace deviascope
