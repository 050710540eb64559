// SPDX-License-Identifier: GPL-2.0-or-later
// MODEL, private: from the sums of an engine to the log-likelihood of a bin
#pragma once

#include <vector>

#include "deviascope/counts/count_map.h"
#include "deviascope/model/parameter_space.h"

namespace deviascope {

/// What is known of a bin before any parameter, divided by its dispersion.
struct BinTotals {
    double sources = 0.0;     ///< N_b / phi
    double exposed = 0.0;     ///< E0_b / phi, steradian
    double dispersion = 1.0;  ///< phi
};

/// Totals of all terms. Errors: InputError where a bin has no pixel, or no source under a
/// monopole prior of shape 0.
std::vector<BinTotals> totals_of(const Counts& counts, const ParameterSpace& space);

/// ln L_b relative to the isotropic sky, monopole integrated out under Gamma(a, b):
///   X - (N + a) ln((E + b) / (E0 + b)) = X - (N + a) log1p(E0 / (E0 + b) expm1(ln(E/E0)))
/// with N, E0 and X = sum_p n_p y_p divided by the dispersion.
/// @param balance       X_b - N_b ln(E_b/E0_b), not yet divided: ln L_b itself for a = b = 0
/// @param log_expected  ln(E_b / E0_b)
double integrated_log_likelihood(const BinTotals& bin,
                                 const MonopolePrior& prior,
                                 double balance,
                                 double log_expected);

/// ln L_b relative to the isotropic sky at its best monopole N / E0, monopole given:
///   X + N (u - expm1(u + ln(E/E0))) = balance + N (t - expm1 t),
///   t = u + ln(E/E0), u = ln(M E0 / N);  N = 0: -M E
/// -inf where M is not a positive finite number.
double sampled_log_likelihood(const BinTotals& bin,
                              double monopole,
                              double balance,
                              double log_expected);

/// Either of them, as the prior asks. @param monopole  of the bin; read where it is sampled
double log_likelihood_of(const BinTotals& bin,
                         const MonopolePrior& prior,
                         double monopole,
                         double balance,
                         double log_expected);

}  // namespace deviascope
