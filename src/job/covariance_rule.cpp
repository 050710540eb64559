// SPDX-License-Identifier: GPL-2.0-or-later
#include "job/covariance_rule.h"

#include <Eigen/Eigenvalues>
#include <vector>

namespace deviascope {

namespace {

bool is_symmetric(const Eigen::MatrixXd& matrix) {
    return (matrix - matrix.transpose()).cwiseAbs().maxCoeff() <=
           1e-9 * matrix.cwiseAbs().maxCoeff();
}

/// Of the quantities that vary; one of variance 0 must have no covariance.
bool is_positive_definite(const Eigen::MatrixXd& covariance, bool constants) {
    std::vector<Eigen::Index> varying;
    for (Eigen::Index i = 0; i < covariance.rows(); ++i) {
        const bool constant = constants && covariance.row(i).isZero(0.0);
        if (!constant && covariance(i, i) <= 0.0) return false;
        if (!constant) varying.push_back(i);
    }
    if (varying.empty()) return true;
    const Eigen::MatrixXd block = covariance(varying, varying);
    const Eigen::VectorXd scale = block.diagonal().cwiseSqrt().cwiseInverse();
    const Eigen::MatrixXd correlation = scale.asDiagonal() * block * scale.asDiagonal();
    const Eigen::VectorXd eigenvalues =
        Eigen::SelfAdjointEigenSolver<Eigen::MatrixXd>(correlation, Eigen::EigenvaluesOnly)
            .eigenvalues();
    return eigenvalues.minCoeff() > 1e-12 * eigenvalues.maxCoeff();
}

}  // namespace

std::optional<Eigen::MatrixXd> read_covariance(const TomlTable& table,
                                               const std::string& key,
                                               Eigen::Index n,
                                               Presence presence,
                                               bool constants) {
    const auto matrix = table.matrix(key, n, presence);
    if (!matrix) return std::nullopt;
    if (!is_symmetric(*matrix)) {
        table.wrong(key, "a symmetric matrix");
        return std::nullopt;
    }
    Eigen::MatrixXd covariance = (*matrix + matrix->transpose()) / 2;
    if (!is_positive_definite(covariance, constants)) {
        table.wrong(key, "a positive definite matrix");
        return std::nullopt;
    }
    return covariance;
}

}  // namespace deviascope
