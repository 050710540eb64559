// SPDX-License-Identifier: GPL-2.0-or-later
// ENSEMBLE, inside: proposals that do not look at where the walker stands
#pragma once

#include <cstddef>
#include <vector>

#include "deviascope/core/random.h"
#include "deviascope/core/target.h"

namespace deviascope {

/// Draws from a fixed mixture about a Gaussian N(m, C):
///   q = 0.9 Normal(m, 1.05 C) + 0.1 Student-t(5 degrees of freedom, location m, scale 1.05 C)
/// The wider scale and the heavy tails keep the ratio of target to proposal bounded where the
/// target has Gaussian tails or the Gaussian is a little too narrow.
/// Threads: const members are pure.
/// Source: Tierney 1994, Ann. Stat. 22, 1701, section 2.3.3 (independence chains); design
/// section 5 for the mixture.
class IndependenceProposal {
  public:
    explicit IndependenceProposal(const CoordinateGaussian& gaussian);

    /// @param y  n coordinates, filled. Stream: component, n normals, for Student-t 5 normals.
    void draw(Stream& stream, double* y) const;
    /// ln q(x), normalised.
    double log_density(const double* x) const;

  private:
    std::size_t n_;
    std::vector<double> mean_;
    std::vector<double> factor_;   ///< of 1.05 C, lower, column by column
    std::vector<double> inverse_;  ///< its inverse, lower, column by column
    double log_normal_ = 0.0;      ///< ln of the normal part's weight and normalisation
    double log_student_ = 0.0;     ///< of the other's
};

}  // namespace deviascope
