// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/summary/consistency.h"

#include <Eigen/Cholesky>
#include <Eigen/Eigenvalues>
#include <Eigen/LU>
#include <cmath>
#include <numbers>

#include "deviascope/core/error.h"
#include "deviascope/summary/significance.h"

namespace deviascope {
namespace {

/// Mean of ln prior(v) over a Gaussian that lies inside the prior's support; NaN for priors
/// that are neither Gaussian nor flat in the vector.
double mean_log_prior(const VelocityGaussian& posterior, const VectorPrior& prior) {
    if (const auto* gaussian = std::get_if<GaussianPrior>(&prior.kind())) {
        const Eigen::Matrix3d precision = gaussian->covariance.inverse();
        const Eigen::Vector3d offset = posterior.mean - gaussian->mean;
        return -0.5 * std::log((2.0 * std::numbers::pi * gaussian->covariance).determinant()) -
               0.5 * offset.dot(precision * offset) -
               0.5 * (precision * posterior.covariance).trace();
    }
    if (!std::holds_alternative<UniformVectorPrior>(prior.kind()))
        return VelocityOffset::undefined;
    return prior.log_density(posterior.mean);
}

double information_gained(const VelocityGaussian& posterior, const VectorPrior& prior) {
    const double entropy =
        0.5 *
        std::log(
            (2.0 * std::numbers::pi * std::numbers::e * posterior.covariance).determinant());
    return -entropy - mean_log_prior(posterior, prior);
}

}  // namespace

std::optional<VelocityGaussian> without_prior(const VelocityGaussian& posterior,
                                              const VectorPrior& prior) {
    if (!(posterior.covariance.diagonal().array() > 0.0).all()) return std::nullopt;
    const auto* gaussian = std::get_if<GaussianPrior>(&prior.kind());
    if (gaussian == nullptr) return posterior;
    const Eigen::Matrix3d whole = posterior.covariance.inverse();
    const Eigen::Matrix3d own = gaussian->covariance.inverse();
    const Eigen::Matrix3d information = whole - own;
    const Eigen::Vector3d weighted = whole * posterior.mean - own * gaussian->mean;
    // In units of the posterior: what is left must be a part of it that can be told from noise.
    constexpr double least_share = 0.05;
    const Eigen::Matrix3d factor = posterior.covariance.llt().matrixL();
    const Eigen::SelfAdjointEigenSolver<Eigen::Matrix3d> share(
        Eigen::Matrix3d(factor.transpose() * information * factor));
    if (!(share.eigenvalues().minCoeff() > least_share)) return std::nullopt;
    const Eigen::Matrix3d covariance = information.inverse();
    return VelocityGaussian{covariance * weighted, covariance};
}

Consistency consistency_of(const std::vector<std::optional<VelocityGaussian>>& surveys) {
    Consistency found;
    Eigen::Matrix3d information = Eigen::Matrix3d::Zero();
    Eigen::Vector3d weighted = Eigen::Vector3d::Zero();
    for (const auto& survey : surveys) {
        if (!survey) continue;
        const Eigen::Matrix3d own = survey->covariance.inverse();
        information += own;
        weighted += own * survey->mean;
        ++found.n_surveys;
    }
    if (found.n_surveys < 2) return found;
    const Eigen::Vector3d mean = information.llt().solve(weighted);
    found.chi2 = 0.0;
    for (const auto& survey : surveys)
        if (survey) {
            const Eigen::Vector3d offset = survey->mean - mean;
            found.chi2 += offset.dot(survey->covariance.llt().solve(offset));
        }
    found.degrees = 3.0 * static_cast<double>(found.n_surveys - 1);
    found.probability = exceedance_of_chi_square(found.chi2, found.degrees);
    found.sigma = sigma_of_chi_square(found.chi2, found.degrees);
    found.ln_suspiciousness = 0.5 * (found.degrees - found.chi2);
    return found;
}

double suspiciousness_from_evidence(const std::vector<VelocityGaussian>& posteriors,
                                    const std::vector<double>& log_evidence,
                                    const VelocityGaussian& joint,
                                    double joint_log_evidence,
                                    const VectorPrior& prior) {
    ensure(posteriors.size() == log_evidence.size(), "a posterior for each evidence");
    double log_ratio = joint_log_evidence, log_information = -information_gained(joint, prior);
    for (std::size_t survey = 0; survey < posteriors.size(); ++survey) {
        log_ratio -= log_evidence[survey];
        log_information += information_gained(posteriors[survey], prior);
    }
    return log_ratio - log_information;
}

}  // namespace deviascope
