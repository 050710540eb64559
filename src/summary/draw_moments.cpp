// SPDX-License-Identifier: GPL-2.0-or-later
#include "summary/draw_moments.h"

#include <Eigen/Cholesky>

namespace deviascope {

DrawMoments moments_of(const Eigen::MatrixXd& draws) {
    const auto n = static_cast<double>(draws.cols());
    DrawMoments moments;
    // About the first draw, so that a small spread about a large mean keeps its digits.
    const Eigen::MatrixXd shifted = draws.colwise() - Eigen::VectorXd(draws.col(0));
    const Eigen::VectorXd shift = shifted.rowwise().mean();
    const Eigen::MatrixXd centred = shifted.colwise() - shift;
    moments.mean = draws.col(0) + shift;
    moments.covariance = centred * centred.transpose() / (n - 1.0);
    return moments;
}

std::optional<CoordinateGaussian> gaussian_of(const Eigen::MatrixXd& draws) {
    if (draws.cols() < 2) return std::nullopt;
    const DrawMoments moments = moments_of(draws);
    // In units of each coordinate's own spread: they run from 1e-7 to 20.
    const Eigen::VectorXd sd = moments.covariance.diagonal().cwiseSqrt();
    if (!(sd.array() > 0.0).all()) return std::nullopt;
    const Eigen::VectorXd inverse = sd.cwiseInverse();
    const Eigen::LLT<Eigen::MatrixXd> factor(inverse.asDiagonal() * moments.covariance *
                                             inverse.asDiagonal());
    if (factor.info() != Eigen::Success) return std::nullopt;
    return CoordinateGaussian{moments.mean,
                              sd.asDiagonal() * Eigen::MatrixXd(factor.matrixL())};
}

}  // namespace deviascope
