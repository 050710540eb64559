// SPDX-License-Identifier: GPL-2.0-or-later
// SUMMARY (private): errors that the weights of a survey share
#pragma once

#include <Eigen/Core>
#include <vector>

#include "deviascope/summary/summary.h"

namespace deviascope {

/// Splits the weights of a survey into what a common error does to a fit and what is left over.
/// With prior means B0_b and n_b sources, least squares with weights n_b of
///
///   B_b = f B0_b + c + rest
///
/// give the common factor f and the shift c. The dipole B_b beta + D of a bin is then the
/// straight line (f beta) B0_b + (D + c beta): a fit with the B0_b and a free intrinsic dipole
/// finds f beta for the velocity and D + c beta for the dipole. Where B0 is the same in all
/// bins there is no such line: f alone, with c = 0. Both are linear in the weights, so that
/// their prior follows from the weights' covariance.
/// @param draws  n_draws x n_bins, of the weights
/// Source: weighted linear regression.
WeightModes weight_modes(const Eigen::VectorXd& n,
                         const WeightPrior& prior,
                         const Eigen::MatrixXd& draws);

}  // namespace deviascope
