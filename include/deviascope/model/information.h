// SPDX-License-Identifier: GPL-2.0-or-later
// counts -> MODEL -> ensemble
#pragma once

#include <Eigen/Core>

#include "deviascope/counts/count_map.h"
#include "deviascope/model/parameter_space.h"

namespace deviascope {

/// Expected (Fisher) information of the counts, divided by the dispersion, on all parameters of
/// a row (n_parameters x n_parameters, in ParameterSpace order; monopoles as ln M), at given
/// parameters: sum_p lambda_p (d ln lambda_p / d theta)(d ln lambda_p / d theta)^T.
/// @param parameters  a full row; a monopole that is NaN is taken as N_b / E_b at the rest
/// @param only_survey  terms of that survey alone; all where negative
/// Source: design section 6; McCullagh & Nelder 1989 for the dispersion.
Eigen::MatrixXd expected_information(const Counts& counts,
                                     const ParameterSpace& space,
                                     const Eigen::Ref<const Eigen::VectorXd>& parameters,
                                     int only_survey = -1);

/// Schur complement: information on the rows and columns `keep` with those of `eliminate`
/// marginalised (pseudo-inverse where they are not determined).
Eigen::MatrixXd eliminate(const Eigen::MatrixXd& information,
                          const std::vector<Eigen::Index>& keep,
                          const std::vector<Eigen::Index>& eliminate);

}  // namespace deviascope
