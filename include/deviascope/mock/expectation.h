// SPDX-License-Identifier: GPL-2.0-or-later
// MOCK: beside the flow; skies with known truth
#pragma once

#include <optional>
#include <vector>

#include "deviascope/mock/scenario.h"

namespace deviascope {

/// Kinematic weight to first order of the sources of a survey inside ranges of measured
/// properties, in closed form. For information only: no sky is drawn with it.
///
///   K = 2 + sum over properties of (edge terms) / (fraction inside the range)
///   flux       (1+<alpha>) [S1 n(S1) - S2 n(S2)],     n(S) = -dN(>S)/dS
///   magnitude  (2.5/ln 10) (1+<alpha>) [n(m2) - n(m1)]
///   redshift   (1+z2) p(z2) - (1+z1) p(z1)
///   size       s2 q(s2) - s1 q(s1)
///
/// from K = d ln(counts) / d ln(delta) at delta = 1; derived in DEVELOPERS.md. For one flux
/// limit it is 2 + x (1+alpha) (Ellis & Baldwin 1984, MNRAS 206, 377).
/// @param ranges  one a property at most; those of the survey's `keep` are not added
/// @return empty where there is no closed form: a range of alpha, or scatter in a property with
///         a finite edge (except where the distribution is a pure power law, which scatter
///         leaves one), or an empty range.
std::optional<double> expected_weight(const MockSurvey& survey,
                                      const std::vector<KeptRange>& ranges);

/// Variance over mean of the number of catalogue rows in a pixel: with k = 1 + Poisson(m) rows
/// a source, E[k^2] / E[k] = 1 + m + m / (1 + m).
double expected_dispersion(const MockSurvey& survey);

}  // namespace deviascope
