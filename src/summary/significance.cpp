// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/summary/significance.h"

#include <boost/math/distributions/chi_squared.hpp>
#include <boost/math/special_functions/erf.hpp>
#include <boost/math/special_functions/gamma.hpp>
#include <cmath>
#include <limits>
#include <numbers>

namespace deviascope {

namespace {

constexpr double least_probability = 1e-300;

/// ln of the exceedance of a large x: (x/2)^(k/2 - 1) e^(-x/2) / Gamma(k/2) (1 + (k - 2)/x).
double log_far_exceedance(double x, double degrees) {
    const double half = 0.5 * degrees;
    return (half - 1.0) * std::log(0.5 * x) - 0.5 * x - boost::math::lgamma(half) +
           std::log1p((degrees - 2.0) / x);
}

/// The s of 2 Q(s) = p for a p far below what a double holds: Newton's method on the leading
/// terms of ln Q.
double far_sigma(double log_p) {
    double sigma = std::sqrt(-2.0 * log_p);
    for (int round = 0; round < 20; ++round) {
        const double log_q = -0.5 * sigma * sigma - std::log(sigma) +
                             0.5 * std::log(2.0 / std::numbers::pi) -
                             std::log1p(1.0 / (sigma * sigma));
        sigma += (log_q - log_p) / (sigma + 1.0 / sigma);
    }
    return sigma;
}

}  // namespace

double exceedance_of_chi_square(double x, double degrees) {
    if (std::isnan(x)) return x;
    if (std::isinf(x)) return 0.0;
    return boost::math::cdf(boost::math::complement(
        boost::math::chi_squared_distribution<double>(degrees), std::max(x, 0.0)));
}

double sigma_of_probability(double p) {
    if (std::isnan(p)) return p;
    if (p <= 0.0) return std::numeric_limits<double>::infinity();
    if (p >= 1.0) return 0.0;
    return std::numbers::sqrt2 * boost::math::erfc_inv(p);
}

double sigma_of_chi_square(double x, double degrees) {
    const double p = exceedance_of_chi_square(x, degrees);
    if (std::isnan(p) || p > least_probability) return sigma_of_probability(p);
    return std::isinf(x) ? x : far_sigma(log_far_exceedance(x, degrees));
}

}  // namespace deviascope
