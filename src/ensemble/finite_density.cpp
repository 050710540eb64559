// SPDX-License-Identifier: GPL-2.0-or-later
#include "ensemble/finite_density.h"

#include <fmt/format.h>
#include <fmt/ranges.h>

#include <cmath>
#include <limits>
#include <string>
#include <vector>

#include "deviascope/core/error.h"

namespace deviascope {

namespace {

constexpr double infinity = std::numeric_limits<double>::infinity();

bool is_density(double log_posterior, double log_likelihood) {
    if (log_posterior == -infinity) return true;
    return std::isfinite(log_posterior) && !std::isnan(log_likelihood) &&
           log_likelihood != infinity;
}

std::string sampled_parameters(const Target& target,
                               const Eigen::Ref<const Eigen::VectorXd>& coordinates) {
    const std::vector<Parameter>& parameters = target.parameters();
    Eigen::MatrixXd value(static_cast<Eigen::Index>(parameters.size()), 1);
    target.to_parameters(coordinates, value);
    std::vector<std::string> named;
    for (std::size_t index = 0; index < parameters.size(); ++index)
        if (parameters[index].role == Role::sampled)
            named.push_back(fmt::format("{} = {:.17g}",
                                        parameters[index].name,
                                        value(static_cast<Eigen::Index>(index), 0)));
    return fmt::format("{}", fmt::join(named, ", "));
}

}  // namespace

void require_density(const Target& target,
                     const WalkerPlace& place,
                     const Eigen::Ref<const Eigen::VectorXd>& coordinates,
                     double log_posterior,
                     double log_likelihood) {
    if (is_density(log_posterior, log_likelihood)) return;
    const std::vector<double> moved(coordinates.begin(), coordinates.end());
    throw NumericalError({fmt::format("replicate {}, walker {}, {} {}",
                                      place.replicate,
                                      place.walker,
                                      place.counted,
                                      place.count),
                          fmt::format("log posterior {}, log likelihood {} at {}; sampler "
                                      "coordinates {:.17g}",
                                      log_posterior,
                                      log_likelihood,
                                      sampled_parameters(target, coordinates),
                                      fmt::join(moved, " ")),
                          "a log density is a finite number, or -inf outside the prior",
                          "this is a fault of the model; please report it with the job file"});
}

}  // namespace deviascope
