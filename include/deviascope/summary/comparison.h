// SPDX-License-Identifier: GPL-2.0-or-later
// chain -> SUMMARY -> figures
#pragma once

#include <cstdint>
#include <optional>
#include <string>
#include <vector>

#include "deviascope/summary/consistency.h"
#include "deviascope/summary/evidence.h"
#include "deviascope/summary/fit_check.h"
#include "deviascope/summary/interval.h"
#include "deviascope/summary/velocity_offset.h"

namespace deviascope {

/// The evidence of a hypothesis with one of its priors wider or narrower.
struct PriorWidth {
    std::string vector;  ///< `velocity` or `intrinsic`
    double factor = 1.0;
    LogEvidence log_evidence;
};

/// One hypothesis about the same counts.
struct HypothesisResult {
    std::string name;
    std::string velocity, intrinsic;  ///< names of its priors
    Evidence evidence;
    /// By way of the hypothesis around it: ln Z of that one (bridge) plus the ratio.
    LogEvidence savage_dickey;
    std::string nested_in;  ///< empty where it is nested in none
    std::vector<PriorWidth> prior_width;
    bool converged = true;
};

/// The intrinsic dipole where the velocity is the reference's.
struct IntrinsicAtReference {
    std::string name;  ///< survey, or `all`
    std::string prior;
    double prior_median_amplitude = 0.0;
    ScalarEstimate amplitude;
    /// Probability that a draw from the clustering prior is as long as one from the
    /// posterior; empty where no such prior was given.
    std::optional<double> clustering_probability;
};

/// A fit of some of the surveys.
struct SurveyFit {
    std::string name;  ///< the survey, `without` it, or `joint`
    VelocityGaussian velocity;
    ScalarEstimate speed;  ///< units of c
    VelocityOffset offset;
    Evidence evidence;
    bool converged = true;
};

struct SurveyPair {
    std::string first, second;
    GaussianDifference
        difference;  ///< of what the counts alone say; NaN where one says too little
};

/// Sky and sources that two surveys share.
struct SurveyOverlap {
    std::string first, second;
    double shared_sky_fraction = 0.0;
    double match_arcsec = 0.0;
    std::optional<std::int64_t> matches;  ///< counted sources of the second with one of the
                                          ///< first within the radius; empty without positions
    double expected_by_chance = 0.0;
};

/// Everything a referee asks of a fit; `deviascope compare`.
struct Comparison {
    std::string job;          ///< title
    std::string fingerprint;  ///< of the job and its inputs: fingerprint_of(Provenance)
    std::string reference;
    Eigen::Vector3d reference_velocity = Eigen::Vector3d::Zero();
    std::string clustering;  ///< name of the clustering prior; may be empty
    std::vector<HypothesisResult> hypotheses;
    std::vector<IntrinsicAtReference> intrinsic;
    std::vector<SurveyFit> alone, without;
    SurveyFit joint;
    std::vector<SurveyPair> pairs;
    Consistency consistency;
    double ln_suspiciousness_from_evidence = VelocityOffset::undefined;
    std::vector<FitCheck> fit;
    Frame frame = Frame::galactic;
    std::vector<SurveyOverlap> overlap;
    std::vector<std::string> warnings;
};

/// How often a draw from a prior (100,000, stream (seed, prior_draw; 1, draw, 0)) is at least
/// as long as a draw of a posterior, averaged over the latter.
/// @param vectors  3 x draws, at least one
double chance_of_length(const VectorPrior& prior,
                        const Eigen::Matrix3Xd& vectors,
                        std::uint64_t seed);

/// Place of the hypothesis with the largest evidence (bridge); 0 where none has one.
std::size_t best_hypothesis(const std::vector<HypothesisResult>& hypotheses);

/// What ln Bayes factors mean, in the grades of Kass & Raftery 1995 (J. Am. Stat. Assoc. 90,
/// 773, section 3.2, natural logarithms halved; from memory): below 1 undecided, below 3
/// positive, below 5 strong, else very strong evidence.
std::string grade_of(double log_bayes_factor);

/// What is doubtful, in plain words: runs that did not converge, evidences that disagree or
/// are poorly known, answers that hang on the width of a prior, bins that scatter too much.
std::vector<std::string> cautions_of(const Comparison& comparison);

/// compare.json (schema 1), compare.txt and compare.csv; README, "The comparison". Undefined
/// numbers are null, `-` and empty.
std::string to_json(const Comparison& comparison);
std::string to_text(const Comparison& comparison);
std::string to_csv(const Comparison& comparison);

/// What figures need of a comparison, from its compare.json: reference, hypotheses with the
/// evidence by bridge, surveys, consistency and warnings; the rest stays empty.
/// @param place  the file, for messages
/// Errors: InputError where it is no such file, or of another schema.
Comparison comparison_of_json(const std::string& text, const std::string& place);

}  // namespace deviascope
