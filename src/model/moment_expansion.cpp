// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/moment_expansion.h"

#include <array>
#include <cmath>

#include "deviascope/counts/moments.h"
#include "model/polynomial.h"

namespace deviascope {
namespace {

using Parts = std::vector<Quadric>;

/// Sum over k >= 1 of P_k(u) / k, P = N W + dP.
Quadric counted_series(const MomentGroup& group,
                       std::size_t bin,
                       const Parts& exposed,
                       const Eigen::Vector3d& u) {
    const Parts excess =
        homogeneous_parts(group.excess.data() + bin, group.n_padded, moment_degree, u);
    Quadric sum;
    for (int degree = 1; degree <= moment_degree; ++degree) {
        const auto k = static_cast<std::size_t>(degree);
        sum += excess[k];
        sum += group.bins[bin].sources / degree * exposed[k];
    }
    return sum;
}

/// ln(1 - beta^2) / 2 = -ln gamma.
Quadric minus_log_gamma(const Eigen::Vector3d& velocity) {
    const double g2 = 1.0 / (1.0 - velocity.squaredNorm());
    return {
        0.5 * std::log1p(-velocity.squaredNorm()),
        -g2 * velocity,
        -g2 * Eigen::Matrix3d::Identity() - 2.0 * g2 * g2 * velocity * velocity.transpose()};
}

void fill_counted(const MomentGroup& group,
                  std::size_t bin,
                  double weight,
                  const std::array<Eigen::Vector3d, 2>& at,
                  BinExpansion& all) {
    const auto exposed = [&](const Eigen::Vector3d& u) {
        return homogeneous_parts(group.exposure.data(), 4, moment_degree, u);
    };
    const Eigen::Vector3d &velocity = at[0], &receding = at[1];
    Quadric kinematic = counted_series(group, bin, exposed(velocity), velocity);
    kinematic += group.bins[bin].sources * minus_log_gamma(velocity);
    const Quadric intrinsic = counted_series(group, bin, exposed(receding), receding);
    const double r = group.bias_ratio;
    all.counted = weight * kinematic.value - intrinsic.value;
    all.counted_gradient << weight * kinematic.gradient, r * intrinsic.gradient,
        kinematic.value;
    all.counted_hessian.topLeftCorner<3, 3>() = weight * kinematic.hessian;
    all.counted_hessian.block<3, 3>(3, 3) = -r * r * intrinsic.hessian;
    all.counted_hessian.block<3, 1>(0, 6) = kinematic.gradient;
    all.counted_hessian.block<1, 3>(6, 0) = kinematic.gradient.transpose();
}

/// c_k(B) = C(B+k-1, k) and its first two derivatives.
struct Binomial {
    double value = 1.0, first = 0.0, second = 0.0;
    void raise(double weight, int k) {
        const double factor = weight + k - 1.0;
        second = (second * factor + 2.0 * first) / k;
        first = (first * factor + value) / k;
        value = value * factor / k;
    }
};

/// F = E / E0 gamma^B and its derivatives.
struct Expected {
    double value = 0.0;
    BinVector gradient = BinVector::Zero();
    BinMatrix hessian = BinMatrix::Zero();
};

/// One degree of F: c (W + d.g).
void add_degree(const Binomial& c,
                const Quadric& w,
                const std::array<Quadric, 3>& g,
                const Eigen::Vector3d& dipole,
                double bias_ratio,
                Expected& all) {
    Quadric both = w;
    for (int axis = 0; axis < 3; ++axis)
        both += dipole[axis] * g[static_cast<std::size_t>(axis)];
    all.value += c.value * both.value;
    all.gradient.head<3>() += c.value * both.gradient;
    all.gradient[6] += c.first * both.value;
    all.hessian.topLeftCorner<3, 3>() += c.value * both.hessian;
    all.hessian.block<3, 1>(0, 6) += c.first * both.gradient;
    all.hessian(6, 6) += c.second * both.value;
    for (int axis = 0; axis < 3; ++axis) {
        const Quadric& one = g[static_cast<std::size_t>(axis)];
        all.gradient[3 + axis] += c.value * bias_ratio * one.value;
        all.hessian.block<3, 1>(0, 3 + axis) += c.value * bias_ratio * one.gradient;
        all.hessian(3 + axis, 6) += c.first * bias_ratio * one.value;
    }
}

Expected expected_series(const MomentGroup& group,
                         double weight,
                         const Eigen::Vector3d& velocity,
                         const Eigen::Vector3d& dipole) {
    std::array<Parts, 4> parts;
    for (std::size_t which = 0; which < 4; ++which)
        parts[which] =
            homogeneous_parts(group.exposure.data() + which, 4, moment_degree, velocity);
    Expected all;
    Binomial c;
    for (int degree = 0; degree <= moment_degree; ++degree) {
        const auto k = static_cast<std::size_t>(degree);
        if (degree > 0) c.raise(weight, degree);
        add_degree(c,
                   parts[0][k],
                   {parts[1][k], parts[2][k], parts[3][k]},
                   dipole,
                   group.bias_ratio,
                   all);
    }
    all.hessian.triangularView<Eigen::StrictlyLower>() = all.hessian.transpose();
    return all;
}

}  // namespace

BinExpansion moment_expansion(const MomentGroup& group,
                              std::size_t bin,
                              const Eigen::Ref<const Eigen::VectorXd>& row) {
    const Eigen::Vector3d velocity = row.head<3>();
    const Eigen::Vector3d dipole = group.bias_ratio * row.segment<3>(group.intrinsic);
    const double weight = row[group.bins[bin].weight];
    BinExpansion all;
    fill_counted(group, bin, weight, {velocity, -dipole}, all);
    const Expected expected = expected_series(group, weight, velocity, dipole);
    const Quadric lorentz = minus_log_gamma(velocity);
    all.log_expected = std::log(expected.value) + weight * lorentz.value;
    const BinVector slope = expected.gradient / expected.value;
    all.log_expected_gradient = slope;
    all.log_expected_gradient.head<3>() += weight * lorentz.gradient;
    all.log_expected_gradient[6] += lorentz.value;
    all.log_expected_hessian = expected.hessian / expected.value - slope * slope.transpose();
    all.log_expected_hessian.topLeftCorner<3, 3>() += weight * lorentz.hessian;
    all.log_expected_hessian.block<3, 1>(0, 6) += lorentz.gradient;
    all.log_expected_hessian.block<1, 3>(6, 0) += lorentz.gradient.transpose();
    return all;
}

}  // namespace deviascope
