// SPDX-License-Identifier: GPL-2.0-or-later
// SUMMARY, private: what estimates of the evidence have in common
#pragma once

#include <Eigen/Core>
#include <span>

#include "deviascope/summary/evidence.h"

namespace deviascope {

/// Mean of a function of some numbers.
template <class Function>
double mean_of(std::span<const double> values, Function function) {
    double sum = 0.0;
    for (const double value : values) sum += function(value);
    return sum / static_cast<double>(values.size());
}

/// Log posterior at many coordinates (one a column), in blocks of fixed size.
Eigen::VectorXd log_posterior_at(const Target& target,
                                 const Eigen::MatrixXd& coordinates,
                                 int threads);

/// Effective number of draws behind the mean of a series a walker, in (row, walker) order; all
/// of them where the series are too short to tell.
double effective_number(std::span<const double> values, Eigen::Index n_series);

/// ln of the mean of exp(x), its standard error, and how many draws carry it:
/// (sum w)^2 / sum w^2 (Kish 1965), times the share of the draws that are effective.
/// The estimate is withheld (NaN) where fewer than 100 do.
struct LogMean {
    LogEvidence estimate;
    double carrying = 0.0;
};
LogMean log_mean_exp(std::span<const double> logs, double share_effective);

}  // namespace deviascope
