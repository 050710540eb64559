// SPDX-License-Identifier: GPL-2.0-or-later
#include "ensemble/start.h"

#include <fmt/format.h>

#include <cmath>

#include "deviascope/core/error.h"
#include "deviascope/core/parallel.h"
#include "deviascope/core/random.h"
#include "ensemble/finite_density.h"

namespace deviascope {

namespace {

struct StartingPoint {
    Eigen::VectorXd coordinates;
    Eigen::VectorXd log_posterior, log_likelihood;  // one value each
};

/// Whether this attempt is a point of finite density.
bool try_start(const Target& target,
               std::uint64_t seed,
               const WalkerPlace& place,
               StartingPoint& point) {
    Stream stream(seed,
                  Purpose::start,
                  static_cast<std::uint64_t>(place.replicate),
                  static_cast<std::uint64_t>(place.walker),
                  static_cast<std::uint64_t>(place.count));
    target.draw_start(stream, point.coordinates);
    target.log_density(point.coordinates, point.log_posterior, point.log_likelihood);
    require_density(
        target, place, point.coordinates, point.log_posterior[0], point.log_likelihood[0]);
    return std::isfinite(point.log_posterior[0]);
}

StartingPoint starting_point(const Target& target, std::uint64_t seed, WalkerPlace place) {
    StartingPoint point{
        Eigen::VectorXd(target.n_coordinates()), Eigen::VectorXd(1), Eigen::VectorXd(1)};
    place.counted = "attempt";
    for (place.count = 0; place.count < most_start_attempts; ++place.count)
        if (try_start(target, seed, place, point)) return point;
    throw NumericalError(
        {fmt::format("replicate {}, walker {}", place.replicate, place.walker),
         fmt::format("none of {} starting points has a finite log posterior density",
                     most_start_attempts),
         "the priors must leave room where the counts put the solution",
         "look for a prior whose bounds exclude what the counts ask for"});
}

}  // namespace

EnsembleState starting_state(const Target& target,
                             const EnsembleOptions& options,
                             const EnsembleShape& shape) {
    const auto n_points = static_cast<std::size_t>(shape.n_replicates * shape.n_walkers);
    const auto n = static_cast<std::size_t>(shape.n_coordinates);
    EnsembleState state;
    state.coordinates.resize(n_points * n);
    state.log_posterior.resize(n_points);
    state.log_likelihood.resize(n_points);
    parallel_for(n_points, options.threads, [&](std::size_t index) {
        WalkerPlace place;
        place.replicate = static_cast<Eigen::Index>(index) / shape.n_walkers;
        place.walker = static_cast<Eigen::Index>(index) % shape.n_walkers;
        const StartingPoint point = starting_point(target, options.seed, place);
        std::copy(point.coordinates.begin(),
                  point.coordinates.end(),
                  state.coordinates.data() + index * n);
        state.log_posterior[index] = point.log_posterior[0];
        state.log_likelihood[index] = point.log_likelihood[0];
    });
    return state;
}

}  // namespace deviascope
