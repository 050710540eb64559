// SPDX-License-Identifier: GPL-2.0-or-later
// A summary written down by hand: two invented surveys, round numbers, every kind of entry.
#pragma once

#include <cmath>
#include <string>

#include "deviascope/summary/summary.h"

namespace example {

inline deviascope::ScalarEstimate estimate(double median, double sd) {
    return {median,
            median + 0.01 * sd,
            sd,
            {median - 0.98 * sd, median + 1.01 * sd},
            {median - 1.95 * sd, median + 2.02 * sd}};
}

inline deviascope::VectorSummary velocity() {
    deviascope::VectorSummary vector;
    vector.name = "velocity";
    vector.prior = "free-velocity";
    vector.prior_description = "constant inside a ball of radius 0.05 c";
    vector.prior_median_amplitude = 0.05 / std::cbrt(2.0);
    vector.amplitude = estimate(1.374e-3, 1.93e-4);
    vector.mean = {-1.0e-4, -9.0e-4, 1.0e-3};
    vector.covariance = 4e-8 * Eigen::Matrix3d::Identity();
    vector.galactic = deviascope::LonLat{263.66, 47.87};
    vector.icrs = deviascope::LonLat{167.51, -7.13};
    vector.region68 = deviascope::SkyRegion{236.766, 8.69};
    vector.region95 = deviascope::SkyRegion{637.366, 14.28};
    return vector;
}

inline deviascope::VectorSummary intrinsic(const std::string& name) {
    deviascope::VectorSummary vector;
    vector.name = name;
    vector.prior = "clustering-modest";
    vector.prior_description = "Gaussian about zero, sd 0.01 a component";
    vector.prior_median_amplitude = 0.01538172;
    vector.amplitude = estimate(4.63e-3, 8.6e-4);
    vector.mean = {2e-3, -1e-3, 4e-3};
    vector.covariance = 7e-7 * Eigen::Matrix3d::Identity();
    vector.galactic = deviascope::LonLat{333.4, 60.8};
    vector.icrs = deviascope::LonLat{200.9, -1.3};
    vector.region68 = deviascope::SkyRegion{472.1, 12.3};
    vector.region95 = deviascope::SkyRegion{1281.0, 20.9};
    return vector;
}

/// A vector that points nowhere in particular.
inline deviascope::VectorSummary unseen(const std::string& name) {
    deviascope::VectorSummary vector = intrinsic(name);
    vector.amplitude = estimate(3.2e-3, 1.4e-3);
    vector.galactic.reset();
    vector.icrs.reset();
    vector.region68 = deviascope::SkyRegion{21300.0, {}};
    vector.region95 = deviascope::SkyRegion{37100.0, {}};
    return vector;
}

inline deviascope::CutReport cuts(std::int64_t rows, std::int64_t kept) {
    deviascope::CutReport report;
    report.rows_read = rows;
    report.rows_kept = kept;
    report.pixels_total = 49152;
    report.pixels_kept = 32512;
    report.cuts = {{"band 20 deg (galactic)", rows - kept - 1234, 16640},
                   {"in no bin", 1234, 0}};
    return report;
}

inline deviascope::SamplingSummary sampling() {
    deviascope::SamplingSummary sampling;
    sampling.converged = true;
    sampling.outcome = {deviascope::Outcome::End::converged, 6144, 512, 4, 1408, true, {}};
    sampling.outcome.tally.tried = {1415578, 2123366, 0};
    sampling.outcome.tally.taken = {353894, 530841, 0};
    sampling.replicates = 4;
    sampling.walkers = 144;
    sampling.n_draws = 811008;
    sampling.walker_rhat_max = 1.0312;
    sampling.replicate_rhat_max = 1.00218;
    sampling.effective_draws_min = 10123.4;
    sampling.autocorrelation_steps_max = 312.25;
    sampling.pixel_evaluations = 3538944;
    const auto scalar = [&](const std::string& name, double scale) {
        deviascope::ScalarDiagnostics diagnostics;
        diagnostics.name = name;
        diagnostics.walker_rhat = 1.0 + 0.0312 / scale;
        diagnostics.replicate_rhat = 1.0 + 0.00218 / scale;
        diagnostics.bulk = 10123.4 * scale;
        diagnostics.tail = 12345.6 * scale;
        diagnostics.autocorrelation_steps = 312.25 / scale;
        sampling.scalars.push_back(diagnostics);
    };
    scalar("velocity.x", 1.0);
    scalar("velocity.y", 1.5);
    scalar("velocity.z", 1.25);
    scalar("intrinsic.dunlin.x", 1.1);
    scalar("weight.dunlin.faint", 2.0);
    scalar("velocity.amplitude", 1.2);
    scalar("velocity.direction.x", 1.3);
    return sampling;
}

inline deviascope::Summary summary() {
    deviascope::Summary summary;
    summary.job = "Dunlin and Lantern, joint";
    summary.velocity = velocity();
    summary.offset_from_cmb = deviascope::CmbOffset{5.3, {1.1, 7.4}, 1.114, {0.951, 1.27}};
    summary.intrinsic = {intrinsic("dunlin"), unseen("lantern")};
    summary.bins = {{"dunlin",
                     "faint",
                     1234567,
                     32512,
                     0.66145833,
                     estimate(148213.0, 133.4),
                     estimate(3.752, 0.049),
                     3.75,
                     0.05},
                    {"dunlin",
                     "bright",
                     345678,
                     32512,
                     0.66145833,
                     estimate(41503.0, 70.6),
                     estimate(4.61, 0.11),
                     4.6,
                     0.12},
                    {"lantern",
                     "all",
                     98765,
                     32512,
                     0.66145833,
                     estimate(11857.0, 37.7),
                     estimate(3.4, 0.0),
                     3.4,
                     0.0}};
    summary.separation.surveys = {{0.357, 0.213, "partly separated: priors matter"},
                                  {0.0,
                                   0.998,
                                   "not separated: the split between velocity and intrinsic "
                                   "dipole is set by the priors"}};
    summary.separation.joint = {{}, 0.187, "partly separated: priors matter"};
    summary.sampling = sampling();
    summary.cuts = {cuts(2000000, 1580245), cuts(150000, 98765)};
    summary.survey_names = {"dunlin", "lantern"};
    summary.warnings = {
        "Velocity and intrinsic dipole are partly separated: priors matter (19 % of the "
        "velocity "
        "comes from priors). Quote the priors with every amplitude.",
        "No detection of the intrinsic dipole of lantern: a vector of zero lies inside its 95 "
        "% "
        "region (chi-squared 2.3 for 3 components). The amplitude is above zero by its volume "
        "factor r^2 alone: read the upper end of its interval as a limit."};
    return summary;
}

}  // namespace example
