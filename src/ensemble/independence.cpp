// SPDX-License-Identifier: GPL-2.0-or-later
#include "ensemble/independence.h"

#include <Eigen/Core>
#include <boost/math/special_functions/gamma.hpp>
#include <cmath>
#include <numbers>

namespace deviascope {

namespace {

constexpr double widened = 1.05;
constexpr double student_share = 0.1;
constexpr int degrees_of_freedom = 5;

/// out += A x of a lower triangle stored column by column. Each element of `out` is added to
/// in the order of the columns, whatever the width of the instructions.
void add_product(const std::vector<double>& lower,
                 std::size_t n,
                 const double* x,
                 double* out) {
    const double* column = lower.data();
    for (std::size_t j = 0; j < n; ++j, column += n) {
        const double factor = x[j];
        for (std::size_t i = j; i < n; ++i) out[i] += column[i] * factor;
    }
}

std::vector<double> stored(const Eigen::MatrixXd& matrix) {
    return {matrix.data(), matrix.data() + matrix.size()};
}

}  // namespace

IndependenceProposal::IndependenceProposal(const CoordinateGaussian& gaussian)
    : n_(static_cast<std::size_t>(gaussian.mean.size())),
      mean_(gaussian.mean.begin(), gaussian.mean.end()) {
    const Eigen::Index size = gaussian.mean.size();
    const Eigen::MatrixXd factor = std::sqrt(widened) * gaussian.factor;
    factor_ = stored(factor);
    inverse_ = stored(
        factor.triangularView<Eigen::Lower>().solve(Eigen::MatrixXd::Identity(size, size)));
    const double n = static_cast<double>(n_), nu = degrees_of_freedom;
    const double log_volume = factor.diagonal().array().log().sum();
    log_normal_ =
        std::log(1.0 - student_share) - 0.5 * n * std::log(2.0 * std::numbers::pi) - log_volume;
    log_student_ = std::log(student_share) + boost::math::lgamma(0.5 * (nu + n)) -
                   boost::math::lgamma(0.5 * nu) - 0.5 * n * std::log(nu * std::numbers::pi) -
                   log_volume;
}

void IndependenceProposal::draw(Stream& stream, double* y) const {
    const bool is_student = uniform(stream) < student_share;
    std::vector<double> standard(n_);
    for (double& component : standard) component = normal(stream);
    if (is_student) {
        double chi_square = 0.0;
        for (int k = 0; k < degrees_of_freedom; ++k) {
            const double component = normal(stream);
            chi_square += component * component;
        }
        const double stretch = std::sqrt(degrees_of_freedom / chi_square);
        for (double& component : standard) component *= stretch;
    }
    for (std::size_t i = 0; i < n_; ++i) y[i] = mean_[i];
    add_product(factor_, n_, standard.data(), y);
}

double IndependenceProposal::log_density(const double* x) const {
    std::vector<double> offset(n_), standard(n_, 0.0);
    for (std::size_t i = 0; i < n_; ++i) offset[i] = x[i] - mean_[i];
    add_product(inverse_, n_, offset.data(), standard.data());
    double square = 0.0;
    for (const double component : standard) square += component * component;
    const double nu = degrees_of_freedom;
    const double normal_part = log_normal_ - 0.5 * square;
    const double student_part =
        log_student_ - 0.5 * (nu + static_cast<double>(n_)) * std::log1p(square / nu);
    const double larger = std::max(normal_part, student_part);
    return larger + std::log1p(std::exp(std::min(normal_part, student_part) - larger));
}

}  // namespace deviascope
