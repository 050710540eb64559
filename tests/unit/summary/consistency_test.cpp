// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/summary/consistency.h"

#include <Eigen/LU>
#include <catch2/catch.hpp>
#include <cmath>
#include <numbers>

using namespace deviascope;

namespace {

VelocityGaussian survey(const Eigen::Vector3d& mean, double sd, double tilt) {
    Eigen::Matrix3d covariance = sd * sd * Eigen::Matrix3d::Identity();
    covariance(0, 1) = covariance(1, 0) = tilt * sd * sd;
    return {mean, covariance};
}

/// The Gaussian posterior under a Gaussian prior, and the ln evidence of a likelihood
/// exp(-(v - m)^T C^-1 (v - m) / 2), in closed form.
struct Conjugate {
    VelocityGaussian posterior;
    double log_evidence;
};

Conjugate conjugate(const VelocityGaussian& likelihood, const GaussianPrior& prior) {
    const Eigen::Matrix3d precision =
        likelihood.covariance.inverse() + prior.covariance.inverse();
    const Eigen::Matrix3d covariance = precision.inverse();
    const Eigen::Vector3d mean =
        covariance * (likelihood.covariance.inverse() * likelihood.mean +
                      prior.covariance.inverse() * prior.mean);
    const Eigen::Matrix3d whole = likelihood.covariance + prior.covariance;
    const Eigen::Vector3d apart = likelihood.mean - prior.mean;
    return {{mean, covariance},
            0.5 * std::log(likelihood.covariance.determinant() / whole.determinant()) -
                0.5 * apart.dot(whole.inverse() * apart)};
}

const std::vector<VelocityGaussian> three{survey({1e-3, 2e-3, -1e-3}, 4e-4, 0.3),
                                          survey({1.5e-3, 1e-3, -0.5e-3}, 6e-4, -0.2),
                                          survey({0.5e-3, 2.2e-3, -1.4e-3}, 9e-4, 0.0)};

}  // namespace

TEST_CASE("two surveys: consistency is the chi-square of their difference", "[summary]") {
    const Consistency found = consistency_of({three[0], three[1]});
    const GaussianDifference pair =
        difference_of(three[0].mean - three[1].mean, three[0].covariance + three[1].covariance);
    CHECK(found.chi2 == Approx(pair.chi2).epsilon(1e-10));
    CHECK(found.degrees == 3.0);
    CHECK(found.sigma == Approx(pair.sigma).epsilon(1e-10));
    CHECK(found.ln_suspiciousness == Approx(0.5 * (3.0 - pair.chi2)).epsilon(1e-10));
}

TEST_CASE("surveys that agree exactly, and too few of them", "[summary]") {
    const Consistency same = consistency_of({three[0], survey(three[0].mean, 1e-3, 0.1)});
    CHECK(same.chi2 == Approx(0.0).margin(1e-9));
    CHECK(same.probability == Approx(1.0).margin(1e-6));
    CHECK(consistency_of({three[0], std::nullopt}).n_surveys == 1);
    CHECK(std::isnan(consistency_of({three[0], std::nullopt}).chi2));
    CHECK(std::isnan(consistency_of({}).sigma));
}

TEST_CASE("taking the prior out gives the likelihood back", "[summary]") {
    const GaussianPrior prior{{2e-4, -1e-4, 5e-4}, 1e-6 * Eigen::Matrix3d::Identity()};
    for (const VelocityGaussian& likelihood : three) {
        const auto back = without_prior(conjugate(likelihood, prior).posterior,
                                        VectorPrior("measured", prior));
        REQUIRE(back);
        CHECK(back->mean.isApprox(likelihood.mean, 1e-9));
        CHECK(back->covariance.isApprox(likelihood.covariance, 1e-9));
    }
    SECTION("a posterior that is the prior says nothing") {
        CHECK_FALSE(
            without_prior({prior.mean, prior.covariance}, VectorPrior("measured", prior)));
        CHECK_FALSE(without_prior({prior.mean, 0.97 * prior.covariance},
                                  VectorPrior("measured", prior)));
    }
    SECTION("a flat prior leaves a posterior as it is") {
        const auto back =
            without_prior(three[0], VectorPrior("flat", UniformVectorPrior{0.05}));
        REQUIRE(back);
        CHECK(back->mean == three[0].mean);
    }
}

TEST_CASE("suspiciousness by its definition equals that of the chi-square", "[summary]") {
    // Handley & Lemos 2019, section on Gaussians: exact where likelihoods and prior are
    // Gaussian and the prior is wide; here in closed form, priors included.
    const GaussianPrior prior{Eigen::Vector3d::Zero(), 4e-4 * Eigen::Matrix3d::Identity()};
    std::vector<std::optional<VelocityGaussian>> own;
    std::vector<VelocityGaussian> posteriors;
    std::vector<double> evidence;
    Eigen::Matrix3d information = Eigen::Matrix3d::Zero();
    Eigen::Vector3d weighted = Eigen::Vector3d::Zero();
    for (const VelocityGaussian& likelihood : three) {
        const Conjugate one = conjugate(likelihood, prior);
        own.emplace_back(likelihood);
        posteriors.push_back(one.posterior);
        evidence.push_back(one.log_evidence);
        information += likelihood.covariance.inverse();
        weighted += likelihood.covariance.inverse() * likelihood.mean;
    }
    const VelocityGaussian together{information.inverse() * weighted, information.inverse()};
    const Consistency consistency = consistency_of(own);
    // The product of three Gaussians is one of their mean, lower by half their chi-square.
    const Conjugate joint = conjugate(together, prior);
    const double by_definition =
        suspiciousness_from_evidence(posteriors,
                                     evidence,
                                     joint.posterior,
                                     joint.log_evidence - 0.5 * consistency.chi2,
                                     VectorPrior("wide", prior));
    CHECK(consistency.degrees == 6.0);
    CHECK(by_definition == Approx(consistency.ln_suspiciousness).margin(0.02));
}

TEST_CASE("suspiciousness from evidence needs a prior flat or Gaussian in the vector",
          "[summary]") {
    CHECK(std::isnan(suspiciousness_from_evidence(
        {three[0]}, {0.0}, three[0], 0.0, VectorPrior("u", UniformAmplitudePrior{0.1}))));
}
