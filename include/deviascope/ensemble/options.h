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
/// Default: 0.4 stretch, 0.6 differential-evolution (until the independence kernel is there).
struct KernelFractions {
    double stretch = 0.4;
    double differential_evolution = 0.6;
    double independence = 0.0;
};

struct EnsembleOptions {
    std::uint64_t seed = 0;
    int replicates = 4;  ///< independent ensembles; 4 lets replicate R-hat mean something
    int walkers = 0;     ///< per replicate, even, >= 2n+2; 0: max(32, 4n)
    double effective_draws =
        10000;  ///< wanted of the worst scalar: 1 % precision of an interval end
    std::int64_t max_steps = 200000;  ///< per walker, warm-up included
    std::int64_t store_every =
        0;  ///< 0: half an autocorrelation time, chosen at the end of warm-up
    KernelFractions kernels;
    int threads = 1;                       ///< never changes a bit of the result
    std::function<bool()> stop_requested;  ///< asked between steps; empty: never
    Progress progress;

    /// Walkers for a target of n coordinates.
    int walkers_for(Eigen::Index n_coordinates) const;
    /// Every violated rule, with value and what is allowed; empty where all is well.
    std::vector<std::string> problems(Eigen::Index n_coordinates) const;
};

}  // namespace deviascope
