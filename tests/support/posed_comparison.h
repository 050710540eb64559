// SPDX-License-Identifier: GPL-2.0-or-later
// A comparison made up for tests: rivals near and far, surveys that agree and one that does
// not.
#pragma once

#include <string>
#include <vector>

#include "deviascope/core/physical_constants.h"
#include "deviascope/summary/comparison.h"

namespace deviascope::test {

inline ScalarEstimate posed_speed(const VelocityGaussian& velocity) {
    const double v = velocity.mean.norm(), sd = std::sqrt(velocity.covariance(0, 0));
    return {
        v, v, sd, {std::max(0.0, v - sd), v + sd}, {std::max(0.0, v - 2.0 * sd), v + 2.0 * sd}};
}

inline SurveyFit posed_fit(const std::string& name, const Eigen::Vector3d& mean, double sd) {
    SurveyFit fit;
    fit.name = name;
    fit.velocity = {mean, sd * sd * Eigen::Matrix3d::Identity()};
    fit.speed = posed_speed(fit.velocity);
    fit.offset.chi2 = mean.squaredNorm() / (sd * sd);
    fit.offset.sigma = mean.norm() / sd;
    return fit;
}

inline HypothesisResult posed_hypothesis(const std::string& name, double ln_evidence) {
    HypothesisResult one;
    one.name = name;
    one.velocity = "free-velocity";
    one.intrinsic = "a-prior-with-a-name-that-fills-the-line";
    one.evidence.bridge = {ln_evidence, 0.012};
    one.prior_width = {{"velocity", 3.0, {ln_evidence - 3.25, 0.02}},
                       {"velocity", 1.0 / 3.0, {ln_evidence + 2.5, 0.02}}};
    return one;
}

/// @param surveys  names; the last one's velocity points the other way
inline Comparison posed_comparison(const std::vector<std::string>& surveys) {
    Comparison all;
    all.job = "Posed";
    all.fingerprint = std::string(64, 'b');
    all.reference = "cmb-velocity";
    all.reference_velocity = {-0.0001, -0.0008, 0.0009};
    all.hypotheses = {posed_hypothesis("reference", -12.5),
                      posed_hypothesis("reference-intrinsic", -250.0),
                      posed_hypothesis("free", 0.0),
                      posed_hypothesis("free-intrinsic", -0.5),
                      posed_hypothesis("one-of-the-job-with-a-name-far-too-long", -40000.0)};
    all.hypotheses[1].converged = false;
    const Eigen::Vector3d mean{-0.002, 0.004, 0.001};
    all.joint = posed_fit("joint", mean, 0.0005);
    for (std::size_t s = 0; s < surveys.size(); ++s) {
        const double sign = s + 1 == surveys.size() ? -1.0 : 1.0;
        all.alone.push_back(posed_fit(surveys[s], sign * mean, 0.001 + 0.0005 * double(s)));
        all.without.push_back(posed_fit(surveys[s], mean, 0.0006));
    }
    all.consistency = {surveys.size(), 25.4, 3.0 * double(surveys.size() - 1), 1e-4, 3.9, -9.7};
    all.warnings = {"dunlin/faint: over-dispersed by 1.31 ± 0.02."};
    return all;
}

}  // namespace deviascope::test
