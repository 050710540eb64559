// SPDX-License-Identifier: GPL-2.0-or-later
// chain -> SUMMARY -> figures
#pragma once

#include <Eigen/Core>
#include <cstddef>
#include <optional>
#include <string>
#include <vector>

#include "deviascope/model/vector_prior.h"
#include "deviascope/summary/velocity_offset.h"

namespace deviascope {

/// A Gaussian in the velocity, units of c.
struct VelocityGaussian {
    Eigen::Vector3d mean = Eigen::Vector3d::Zero();
    Eigen::Matrix3d covariance = Eigen::Matrix3d::Identity();
};

/// What the counts alone say of the velocity: the posterior's Gaussian with the prior's taken
/// out, J = Sigma^-1 - Pi^-1, J v = Sigma^-1 mu - Pi^-1 mu_prior. Priors that are bounded are
/// flat here (Pi^-1 = 0).
/// @return nothing where J is not positive definite: the prior, not the counts, holds the
///         velocity
std::optional<VelocityGaussian> without_prior(const VelocityGaussian& posterior,
                                              const VectorPrior& prior);

/// Do surveys that were fitted apart tell of one velocity?
///   v = (sum J_s)^-1 sum J_s v_s,  chi2 = sum (v_s - v)^T J_s (v_s - v),  3 (n - 1) degrees
/// For Gaussians this chi2 and the suspiciousness of Handley & Lemos 2019 (Phys. Rev. D 100,
/// 043504, from memory) are one: ln S = (d - chi2) / 2, d the number of degrees of freedom.
struct Consistency {
    std::size_t n_surveys = 0;  ///< that hold the velocity by themselves
    double chi2 = VelocityOffset::undefined;
    double degrees = 0.0;
    double probability = VelocityOffset::undefined;
    double sigma = VelocityOffset::undefined;
    double ln_suspiciousness = VelocityOffset::undefined;
};
/// @param surveys  each without its prior; those that are empty are left out. All NaN with
///                 fewer than two.
Consistency consistency_of(const std::vector<std::optional<VelocityGaussian>>& surveys);

/// ln S by its definition, ln R - ln I:
///   ln R = ln Z_joint - sum ln Z_s,
///   ln I = sum D_s - D_joint,  D the information gained on the velocity (Kullback & Leibler
///   1951), of Gaussian posteriors against the prior
/// @param posteriors  of the surveys, priors included; @param log_evidence  likewise
double suspiciousness_from_evidence(const std::vector<VelocityGaussian>& posteriors,
                                    const std::vector<double>& log_evidence,
                                    const VelocityGaussian& joint,
                                    double joint_log_evidence,
                                    const VectorPrior& prior);

}  // namespace deviascope
