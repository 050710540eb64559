// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/ensemble/options.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "deviascope/core/error.h"

namespace deviascope {

namespace {

constexpr int most_replicates = 10'000;
constexpr int most_walkers = 1'000'000;
constexpr std::int64_t most_steps = 1'000'000'000'000;
constexpr double fraction_tolerance = 1e-9;

/// Collects violated rules.
class Rules {
  public:
    void require(bool holds, std::string place, std::string found, std::string allowed) {
        require(holds, {std::move(place), std::move(found), std::move(allowed), ""});
    }
    void require(bool holds, const Message& message) {
        if (!holds) problems_.push_back(message.text());
    }
    std::vector<std::string> take() { return std::move(problems_); }

  private:
    std::vector<std::string> problems_;
};

void check_walkers(Rules& rules, int walkers, Eigen::Index n_coordinates) {
    const Eigen::Index fewest = 2 * n_coordinates + 2;
    rules.require(
        walkers % 2 == 0 && walkers >= fewest && walkers <= most_walkers,
        {"walkers",
         fmt::format("{}", walkers),
         fmt::format("an even number from {} to {} is allowed", fewest, most_walkers),
         fmt::format("{} coordinates are sampled, and each half must span them; leave the key "
                     "out to have it chosen",
                     n_coordinates)});
}

void check_kernels(Rules& rules, const KernelFractions& kernels) {
    double total = 0.0;
    for (std::size_t index = 0; index < n_kernels; ++index) {
        const auto kernel = static_cast<Kernel>(index);
        const double fraction = kernels.of(kernel);
        total += fraction;
        rules.require(fraction >= 0.0 && fraction <= 1.0,
                      "kernels." + name_of(kernel),
                      fmt::format("{}", fraction),
                      "a fraction from 0 to 1 is allowed");
    }
    rules.require(std::abs(total - 1.0) <= fraction_tolerance,
                  "kernels",
                  fmt::format("the fractions add to {}", total),
                  "they must add to 1");
}

}  // namespace

std::string name_of(Kernel kernel) {
    switch (kernel) {
        case Kernel::stretch:
            return "stretch";
        case Kernel::differential_evolution:
            return "differential-evolution";
        case Kernel::independence:
            return "independence";
    }
    ensure(false, "a kernel has a name");
    return {};
}

double KernelFractions::of(Kernel kernel) const {
    switch (kernel) {
        case Kernel::stretch:
            return stretch;
        case Kernel::differential_evolution:
            return differential_evolution;
        case Kernel::independence:
            return independence;
    }
    ensure(false, "a kernel has a fraction");
    return 0.0;
}

int EnsembleOptions::walkers_for(Eigen::Index n_coordinates) const {
    if (walkers != 0) return walkers;
    return static_cast<int>(std::max<Eigen::Index>(32, 4 * n_coordinates));
}

std::vector<std::string> EnsembleOptions::problems(Eigen::Index n_coordinates) const {
    Rules rules;
    rules.require(replicates >= 1 && replicates <= most_replicates,
                  "replicates",
                  fmt::format("{}", replicates),
                  fmt::format("a number from 1 to {} is allowed", most_replicates));
    check_walkers(rules, walkers_for(n_coordinates), n_coordinates);
    rules.require(effective_draws > 0.0 && std::isfinite(effective_draws),
                  "effective_draws",
                  fmt::format("{}", effective_draws),
                  "a finite number above 0 is allowed");
    rules.require(max_steps >= 2 && max_steps <= most_steps,
                  "max_steps",
                  fmt::format("{}", max_steps),
                  fmt::format("a number from 2 to {} is allowed", most_steps));
    rules.require(store_every >= 0 && store_every <= std::max<std::int64_t>(max_steps, 0),
                  "store_every",
                  fmt::format("{}", store_every),
                  "a number from 0 (chosen at the end of the warm-up) to max_steps is allowed");
    check_kernels(rules, kernels);
    rules.require(threads >= 1, "threads", fmt::format("{}", threads), "at least 1 is needed");
    return rules.take();
}

}  // namespace deviascope
