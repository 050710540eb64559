// SPDX-License-Identifier: GPL-2.0-or-later
// chain -> SUMMARY -> figures
#pragma once

#include <map>
#include <optional>
#include <string>
#include <vector>

#include "deviascope/chain/chain.h"
#include "deviascope/ensemble/diagnostics.h"
#include "deviascope/model/parameter_space.h"
#include "deviascope/summary/direction_density.h"
#include "deviascope/summary/interval.h"
#include "deviascope/summary/separation.h"
#include "deviascope/summary/upper_limit.h"

namespace deviascope {

/// A region of sky: smallest area that holds the probability, and the quantile of the angular
/// distance from the mean direction (empty where there is no mean direction).
struct SkyRegion {
    double area_deg2 = 0.0;
    std::optional<double> radius_deg;
};

/// What is reported of one vector.
struct VectorSummary {
    std::string name;   ///< `velocity`, or the survey of an intrinsic dipole, or `all`
    std::string prior;  ///< its name
    std::string prior_description;  ///< its density in words and numbers
    double prior_median_amplitude = 0.0;
    bool amplitude_free = true;                      ///< false: the prior fixes the amplitude
    bool direction_free = true;                      ///< false: the prior fixes the direction
    ScalarEstimate amplitude;                        ///< in c (velocity) or dimensionless
    std::optional<UpperLimits> amplitude_limits;     ///< where it is not told from zero
    Eigen::Vector3d mean = Eigen::Vector3d::Zero();  ///< job's frame
    Eigen::Matrix3d covariance = Eigen::Matrix3d::Zero();  ///< of the draws, with n - 1
    std::optional<LonLat> galactic, icrs;         ///< of the mean direction, or the fixed one
    std::optional<SkyRegion> region68, region95;  ///< empty where the direction is fixed
    std::int64_t draws_without_direction = 0;     ///< of length zero, left out of directions
};

/// Offset of the velocity from the `cmb-velocity` prior. NaN where constant.
struct CmbOffset {
    double angle_median_deg = 0.0;
    Interval angle68_deg{};
    double speed_ratio_median = 0.0;
    Interval speed_ratio68{};
};

struct BinSummary {
    std::string survey, bin;
    std::int64_t sources = 0, pixels = 0;
    double sky_fraction = 0.0;
    ScalarEstimate monopole, weight;  ///< 1/sr; 1
    double weight_prior_mean = 0.0, weight_prior_sd = 0.0;
};

/// One combination of the weights of a survey.
struct WeightMode {
    double mean = 0.0;      ///< posterior
    double sd = 0.0;        ///< posterior
    double prior_sd = 0.0;  ///< 0: the weights are fixed
};

/// The common and the differential mode of a survey's weights (README, "The summary, number by
/// number"): the first rescales the velocity, the second fakes an intrinsic dipole.
struct WeightModes {
    WeightMode common;        ///< factor on the prior means; prior mean 1
    WeightMode differential;  ///< shift of the weights that the factor leaves; prior mean 0
};

struct SamplingSummary {
    bool converged = false;
    Outcome outcome;
    Eigen::Index replicates = 0, walkers = 0;
    std::int64_t n_draws = 0;  ///< stored rows x replicates x walkers
    double walker_rhat_max = 0.0, replicate_rhat_max = 0.0;
    double effective_draws_min = 0.0, autocorrelation_steps_max = 0.0;
    std::int64_t moment_evaluations = 0, pixel_evaluations = 0;
    std::vector<ScalarDiagnostics> scalars;
};

struct Summary {
    std::string job;  ///< title
    Frame frame = Frame::galactic;
    VectorSummary velocity;
    std::optional<CmbOffset> offset_from_cmb;  ///< empty where the velocity is zero
    std::vector<VectorSummary> intrinsic;
    std::vector<BinSummary> bins;
    std::vector<WeightModes> weight_modes;  ///< per survey, job order
    Separation separation;
    SamplingSummary sampling;
    std::vector<CutReport> cuts;  ///< per survey, job order
    std::vector<std::string> survey_names;
    std::vector<std::string> warnings;  ///< plain words
};

struct SummaryOptions {
    std::string title;
    std::uint64_t seed = 0;
    Eigen::Vector3d cmb_velocity =
        Eigen::Vector3d::Zero();  ///< mean of the cmb-velocity prior, job's frame, units of c
    double effective_draws_wanted = 10000;  ///< of the job; named where a run fell short of it
    std::vector<std::string> job_warnings;  ///< warnings of earlier stages to carry
    int threads = 1;
};

/// Numbers from draws; definitions in the README, "The summary, number by number".
///
/// Evaluations: those of starting points and proposals inside the walls of the priors.
/// Errors: InputError where the chain holds no stored draws.
/// Threads: main thread; works on `options.threads`; same bits for any number.
Summary summarise(const Chain& chain,
                  const ParameterSpace& space,
                  const SummaryOptions& options);

/// summary.json, schema 1: keys as in the README, "Files". A number, interval, vector or
/// verdict that is undefined, or whose quantity is constant (fixed by a prior), is null;
/// objects always have all their keys. Doubles are printed so that reading them back gives the
/// same bits. Ends with a new line.
std::string to_json(const Summary& summary);

/// summary.txt: what a referee reads; at most 100 columns, plain text, our own wording. Numbers
/// are rounded to two digits of half their 68 % interval.
std::string to_text(const Summary& summary);

/// The table of cuts of one survey, plain text.
std::string cut_table(const std::string& survey, const CutReport& cuts);

}  // namespace deviascope
