// SPDX-License-Identifier: GPL-2.0-or-later
// counts -> MODEL -> ensemble
#pragma once

#include <Eigen/Core>
#include <vector>

#include "deviascope/counts/count_map.h"
#include "deviascope/model/parameter_space.h"

namespace deviascope {

/// First derivatives of the log-likelihood of the counts, and what is expected of the second,
/// at given parameters, in all parameters of a row (ParameterSpace order; monopoles as ln M),
/// constants and redrawn ones included:
///
///   score = sum_p (n_p - lambda_p) g_p / phi,  information = sum_p lambda_p g_p g_p^T / phi,
///   g = d ln lambda / d theta:  velocity B n / (1 - beta.n) - B gamma^2 beta,
///       intrinsic r n / (1 + r D.n),  weight -ln gamma - ln(1 - beta.n),  ln M 1
struct Derivatives {
    Eigen::VectorXd score;        ///< n_parameters
    Eigen::MatrixXd information;  ///< n_parameters x n_parameters
};

/// @param parameters   a full row, inside the walls; a monopole that is NaN is taken as
///                     N_b / E_b at the rest (its maximum)
/// @param only_survey  terms of that survey alone; all where negative
/// Source: the derivatives of the README's lambda; McCullagh & Nelder 1989 for the dispersion.
Derivatives derivatives(const Counts& counts,
                        const ParameterSpace& space,
                        const Eigen::Ref<const Eigen::VectorXd>& parameters,
                        int only_survey = -1);

/// Expected (Fisher) information of the counts, divided by the dispersion: `derivatives` at the
/// same arguments.
Eigen::MatrixXd expected_information(const Counts& counts,
                                     const ParameterSpace& space,
                                     const Eigen::Ref<const Eigen::VectorXd>& parameters,
                                     int only_survey = -1);

/// The same of the counts of one bin alone: n_parameters x n_parameters, with ln M of that bin
/// but zero outside its own parameters.
Eigen::MatrixXd bin_information(const Counts& counts,
                                const BinTerm& term,
                                Eigen::Index n_parameters,
                                const Eigen::Ref<const Eigen::VectorXd>& parameters);

/// Schur complement: information on the rows and columns `keep` with those of `eliminate`
/// marginalised. Directions of the eliminated block that the counts do not determine
/// (eigenvalue of its correlation form below 1e-12 of the largest) are left out: the
/// information matrix is positive semi-definite, so that they do not touch the rest.
/// @return  keep.size() x keep.size(), symmetric, in the order of `keep`
Eigen::MatrixXd eliminate(const Eigen::MatrixXd& information,
                          const std::vector<Eigen::Index>& keep,
                          const std::vector<Eigen::Index>& eliminate);

}  // namespace deviascope
