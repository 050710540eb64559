// SPDX-License-Identifier: GPL-2.0-or-later
// Posteriors that figures find hard: each has broken a plot of someone's.
#pragma once

#include <string>
#include <vector>

#include "posed_posterior.h"

namespace deviascope::test {

struct HardPosterior {
    std::string name;
    Pose pose;
};

inline PosedVector ball(Eigen::Vector3d mean, double sd) {
    return {VectorPrior("free", UniformVectorPrior{0.1}), cloud(mean, sd)};
}

inline PosedVector fixed_at_zero() {
    return {VectorPrior("no-motion", FixedPrior{}),
            [](Stream&) { return Eigen::Vector3d(Eigen::Vector3d::Zero()); }};
}

/// Uniform in amplitude up to 0.01, all over the sky.
inline PosedVector one_sided() {
    return {VectorPrior("uniform-amplitude", UniformAmplitudePrior{0.1}), [](Stream& stream) {
                const Eigen::Vector3d turn = cloud(Eigen::Vector3d::Zero(), 1.0)(stream);
                const double length = std::abs(0.004 * normal(stream));
                return Eigen::Vector3d(std::min(length, 0.09) * turn.normalized());
            }};
}

/// Two lobes on opposite sides of the sky.
inline PosedVector two_lobed() {
    return {VectorPrior("free", UniformVectorPrior{0.1}), [](Stream& stream) {
                const double side = uniform(stream) < 0.5 ? -1.0 : 1.0;
                return Eigen::Vector3d(
                    cloud(side * 0.02 * direction_of(100.0, 30.0), 0.003)(stream));
            }};
}

/// Along a fixed direction: one parameter.
inline PosedVector along_axis() {
    const Direction axis = direction_of(264.0, 48.0);
    return {VectorPrior("axis", AxisPrior{axis, 0.01}), [axis](Stream& stream) {
                return Eigen::Vector3d(std::abs(0.002 + 0.0006 * normal(stream)) * axis);
            }};
}

/// A direction known to half a minute of arc.
inline PosedVector tiny() {
    const GaussianPrior prior{1.23e-3 * direction_of(264.0, 48.0),
                              1e-14 * Eigen::Matrix3d::Identity()};
    return {VectorPrior("cmb-velocity", prior), cloud(prior.mean, 1e-7)};
}

inline std::vector<HardPosterior> hard_posteriors() {
    const std::string long_name =
        "a-survey-with-a-name-that-nobody-would-want-to-type-twice-over";
    const PosedVector plain = ball(0.02 * direction_of(60.0, -20.0), 0.003);
    std::vector<HardPosterior> all{
        {"pole", {ball(0.02 * direction_of(10.0, 89.0), 0.003), {plain}, {"dunlin"}}},
        {"south-pole", {ball(0.02 * direction_of(0.0, -90.0), 0.006), {plain}, {"dunlin"}}},
        {"both-seams",
         {ball(0.02 * direction_of(180.0, 0.0), 0.003),
          {ball(0.02 * direction_of(0.0, 10.0), 0.003)},
          {"dunlin"}}},
        {"all-sky", {ball(Eigen::Vector3d::Zero(), 0.003), {plain}, {"dunlin"}}},
        {"two-lobed", {two_lobed(), {plain}, {"dunlin"}}},
        {"tiny", {tiny(), {plain}, {"dunlin"}}},
        {"one-sided", {one_sided(), {one_sided()}, {"dunlin"}}},
        {"one-parameter", {along_axis(), {fixed_at_zero()}, {"dunlin"}}},
        {"nothing-free", {fixed_at_zero(), {fixed_at_zero()}, {"dunlin"}}},
        {"nine-parameters",
         {ball({-1e-5, 0.02, 1e-5}, 0.003), {plain, plain}, {"dunlin", "lantern"}}},
        {"long-names",
         {ball(0.02 * direction_of(350.0, -60.0), 0.003),
          {plain, plain},
          {long_name, long_name + "-2"},
          {"the-faintest-of-all-the-bins-there-are", "b"}}},
    };
    Pose six{ball(0.02 * direction_of(210.0, 35.0), 0.003), {}, {}};
    for (int survey = 0; survey < 6; ++survey) {
        six.surveys.push_back("survey-" + std::to_string(survey + 1));
        six.intrinsic.push_back(
            ball(0.02 * direction_of(60.0 * survey, 12.0 * survey - 30.0), 0.003));
    }
    all.push_back({"six-surveys", six});
    return all;
}

}  // namespace deviascope::test
