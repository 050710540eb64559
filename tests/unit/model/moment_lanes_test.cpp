// SPDX-License-Identifier: GPL-2.0-or-later
// The same bits from every instruction set that this machine has.
#include "model/moment_lanes.h"

#include <catch2/catch.hpp>
#include <cmath>

#include "deviascope/core/random.h"
#include "deviascope/model/parameter_space.h"
#include "synthetic_counts.h"

namespace deviascope {

// model/moment_lanes.cpp compiled for one instruction set each.
void sum_lanes_baseline(const std::vector<MomentGroup>&, const LaneWalkers&, LaneSums&);
void sum_lanes_avx2(const std::vector<MomentGroup>&, const LaneWalkers&, LaneSums&);
void sum_lanes_x86_64_v4(const std::vector<MomentGroup>&, const LaneWalkers&, LaneSums&);

}  // namespace deviascope

using namespace deviascope;

namespace {

std::vector<MomentGroup> groups() {
    const std::vector<synthetic::Survey> surveys = {
        {"dunlin",
         {{"a", 1e4, 3.0},
          {"b", 3e4, 13.6},
          {"c", 1e4, -2.0},
          {"d", 1e4, 5.0},
          {"e", 1e4, 1.0}},
         {0.01, 0.0, -0.01},
         [](const Direction& n) { return n.z() > -0.3 ? 1.0 - 0.5 * n.x() * n.x() : 0.0; }},
        {"lantern", {{"one", 1e6, 5.0}}}};
    Counts counts = synthetic::make_counts(8, {0.002, 0.001, -0.003}, surveys, 71);
    add_moments(counts);
    const VectorPrior wide("wide", UniformVectorPrior{1.0});
    return make_moment_groups(
        counts, ParameterSpace(counts, synthetic::make_model(surveys, wide, wide)));
}

/// Lanes of unlike degrees; in one of them the expected excess is large.
LaneWalkers walkers() {
    Stream stream(20261201, Purpose::test, 0, 0, 0);
    LaneWalkers made;
    made.receding.resize(2);
    made.weight.resize(6);
    for (std::size_t lane = 0; lane < n_lanes; ++lane) {
        const int degree = 1 + static_cast<int>(lane);
        made.velocity.set_degree(lane, degree);
        const double size = lane == 5 ? 0.06 : 0.004;
        for (LaneNumber& axis : made.velocity.vector) axis.set(lane, size * normal(stream));
        for (LaneSeries& series : made.receding) {
            series.set_degree(lane, 9 - degree);
            for (LaneNumber& axis : series.vector) axis.set(lane, 0.03 * normal(stream));
        }
        for (LaneNumber& weight : made.weight) weight.set(lane, 5.0 + 4.0 * normal(stream));
    }
    return made;
}

using SumLanes = void (*)(const std::vector<MomentGroup>&, const LaneWalkers&, LaneSums&);

LaneSums sums_by(SumLanes sum) {
    LaneSums sums;
    sums.balance.resize(6);
    sums.log_excess.resize(6);
    sum(groups(), walkers(), sums);
    return sums;
}

bool same_bits(const LaneSums& a, const LaneSums& b) {
    bool same = true;
    for (std::size_t t = 0; t < a.balance.size(); ++t)
        for (std::size_t lane = 0; lane < n_lanes; ++lane)
            same = same && a.balance[t].at(lane) == b.balance[t].at(lane) &&
                   a.log_excess[t].at(lane) == b.log_excess[t].at(lane);
    return same;
}

}  // namespace

TEST_CASE("the moment engine gives the same bits with every instruction set", "[model]") {
    const LaneSums chosen = sums_by(sum_lanes);
    CHECK(std::isfinite(chosen.balance[0].at(5)));
    CHECK(same_bits(sums_by(sum_lanes_baseline), chosen));
#if defined(__x86_64__)
    if (__builtin_cpu_supports("avx2")) CHECK(same_bits(sums_by(sum_lanes_avx2), chosen));
    if (__builtin_cpu_supports("avx512vl") && __builtin_cpu_supports("avx512dq"))
        CHECK(same_bits(sums_by(sum_lanes_x86_64_v4), chosen));
#endif
}
