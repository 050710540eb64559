// SPDX-License-Identifier: GPL-2.0-or-later
// model -> ENSEMBLE -> chain
#pragma once

#include <Eigen/Core>
#include <cstdint>
#include <functional>
#include <string>
#include <vector>

#include "deviascope/core/progress.h"

namespace deviascope {

/// Kernels in the order in which tallies and files list them.
enum class Kernel { stretch, differential_evolution, independence };
inline constexpr std::size_t n_kernels = 3;
/// `stretch`, `differential-evolution`, `independence`.
std::string name_of(Kernel kernel);

/// Probability with which each kernel is drawn, per walker and step; they add to 1.
/// Where a target offers no approximation, the share of independence goes to the others.
/// Default: chosen by measurement (DEVELOPERS.md, "Kernel fractions").
struct KernelFractions {
    double stretch = 0.2;
    double differential_evolution = 0.3;
    double independence = 0.5;

    double of(Kernel kernel) const;
};

struct EnsembleOptions {
    std::uint64_t seed = 0;
    int replicates = 4;  ///< independent ensembles; 4 lets replicate R-hat mean something
    int walkers = 0;     ///< per replicate, even, >= 2n+2; 0: max(32, 4n)
    /// Wanted of the worst scalar; 10,000: the end of an interval good to 1 %.
    double effective_draws = 10000;
    std::int64_t max_steps = 200000;  ///< per walker, warm-up included; at least 2
    /// 0: half an autocorrelation time, chosen at the end of the warm-up.
    std::int64_t store_every = 0;
    KernelFractions kernels;
    int threads = 1;  ///< never changes a bit of the result
    /// Rows handed to the sink at a time; 0: as many as a few seconds bring, so that storing
    /// costs a small share of the time. Never changes a bit of the result.
    std::int64_t rows_per_block = 0;
    /// Asked on the main thread between steps, several times a second where a step is short;
    /// empty: never.
    std::function<bool()> stop_requested;
    Progress progress;

    /// Walkers per replicate for a target of n coordinates.
    int walkers_for(Eigen::Index n_coordinates) const;
    /// Every violated rule, with value and what is allowed; empty where all is well. Each is
    /// one line in the grammar of `Message`, its place the key of the job file's `[ensemble]`.
    std::vector<std::string> problems(Eigen::Index n_coordinates) const;
};

}  // namespace deviascope
