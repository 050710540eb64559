// SPDX-License-Identifier: GPL-2.0-or-later
// chain -> SUMMARY -> figures
#pragma once

namespace deviascope {

/// Probability that a chi-square variate of `degrees` (> 0) exceeds x (>= 0). Accurate to 1e-12
/// relative down to 1e-300, 0 below. NaN for NaN.
double exceedance_of_chi_square(double x, double degrees);

/// Two-sided level of a probability, in standard deviations of a normal variate:
/// sqrt(2) erfinv(1 - p); 0 for p = 1, infinite for 0.
double sigma_of_probability(double p);

/// sigma_of_probability(exceedance_of_chi_square(x, degrees)), finite where that probability is
/// below what a double holds (by the leading terms of both tails, error below 0.01).
double sigma_of_chi_square(double x, double degrees);

}  // namespace deviascope
