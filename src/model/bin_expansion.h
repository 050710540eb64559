// SPDX-License-Identifier: GPL-2.0-or-later
// MODEL, private: a bin's sums with their first and second derivatives
#pragma once

#include <Eigen/Core>

#include "deviascope/counts/count_map.h"
#include "deviascope/model/parameter_space.h"
#include "model/bin_likelihood.h"

namespace deviascope {

/// What the sums of a bin depend on, in this order: velocity (3), intrinsic vector (3), weight.
inline constexpr int n_bin_variables = 7;
using BinVector = Eigen::Matrix<double, n_bin_variables, 1>;
using BinMatrix = Eigen::Matrix<double, n_bin_variables, n_bin_variables>;

/// C = sum_p n_p y_p and ln(E/E0) of a bin at a point, to second order.
struct BinExpansion {
    double counted = 0.0;
    BinVector counted_gradient = BinVector::Zero();
    BinMatrix counted_hessian = BinMatrix::Zero();
    double log_expected = 0.0;
    BinVector log_expected_gradient = BinVector::Zero();
    BinMatrix log_expected_hessian = BinMatrix::Zero();
};

/// From a pass over the pixels. @param row  parameters, inside the walls
BinExpansion pixel_expansion(const Counts& counts,
                             const BinTerm& term,
                             const Eigen::Ref<const Eigen::VectorXd>& row);

/// ln L of a bin to second order, in the variables of BinExpansion and ln M (last; its
/// derivatives are 0 where the monopole is integrated out).
struct BinLogLikelihood {
    double value = 0.0;
    Eigen::Matrix<double, n_bin_variables + 1, 1> gradient;
    Eigen::Matrix<double, n_bin_variables + 1, n_bin_variables + 1> hessian;
};

/// With s = E/(E+b):  gradient C' - (N+a) s L',  hessian C'' - (N+a) (s L'' + s(1-s) L' L'^T),
/// L = ln(E/E0); monopole given:  C' - M E L', C'' - M E (L'' + L' L'^T), in ln M: N - M E.
/// @param monopole  of the bin, where it is sampled
BinLogLikelihood log_likelihood_of(const BinExpansion& expansion,
                                   const BinTotals& totals,
                                   const MonopolePrior& prior,
                                   double monopole);

}  // namespace deviascope
