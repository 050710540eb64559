// SPDX-License-Identifier: GPL-2.0-or-later
// How many times faster an evaluation of the whole posterior is than a plain NumPy script of
// the same posterior (tests/reference/numpy_posterior), on one core, in CPU time, taken in
// turns in one run; and how that depends on pixels and sources.
#include <fmt/format.h>

#include <algorithm>

#include "bench_problem.h"
#include "deviascope/model/posterior.h"
#include "python_check.h"

using namespace deviascope;

namespace {

constexpr int n_rounds = 7;
constexpr Eigen::Index n_walkers = 72;

/// Draws from the Laplace approximation: where a sampler is.
Eigen::MatrixXd typical_walkers(const Posterior& target) {
    const CoordinateGaussian& gaussian = *target.approximation();
    Eigen::MatrixXd walkers(target.n_coordinates(), n_walkers);
    for (Eigen::Index w = 0; w < n_walkers; ++w) {
        Stream stream(1, Purpose::test, 0, static_cast<std::uint64_t>(w), 0);
        Eigen::VectorXd standard(target.n_coordinates());
        for (double& component : standard) component = normal(stream);
        walkers.col(w) = gaussian.mean + gaussian.factor * standard;
    }
    return walkers;
}

/// CPU seconds an evaluation.
double time_once(const Posterior& target, const Eigen::MatrixXd& walkers, int repeats) {
    Eigen::VectorXd posterior(walkers.cols()), likelihood(walkers.cols());
    const double begin = bench::cpu_seconds();
    for (int repeat = 0; repeat < repeats; ++repeat)
        target.log_density(walkers, posterior, likelihood);
    return (bench::cpu_seconds() - begin) / static_cast<double>(repeats * walkers.cols());
}

void compare_with_numpy() {
    const Counts counts = bench::make_counts(64, 1e7);
    const Posterior fast(counts, bench::make_model(Engine::automatic));
    const Posterior reference(counts, bench::make_model(Engine::pixel));
    const Eigen::MatrixXd walkers = typical_walkers(fast);
    const std::string script = DEVIASCOPE_TEST_DATA "/reference/numpy_posterior/posterior.py";
    std::vector<double> by_moments, by_pixels, by_numpy;
    for (int round = 0; round < n_rounds; ++round) {
        by_moments.push_back(time_once(fast, walkers, 1000));
        by_pixels.push_back(time_once(reference, walkers, 1));
        by_numpy.push_back(std::stod(test::run_python(script, {"--time"}).output));
    }
    const double numpy = bench::median(by_numpy);
    fmt::print("three surveys, 24 bins, nside 64, 10^7 sources; medians of {} rounds\n",
               n_rounds);
    fmt::print("  NumPy script   {:10.2f} us an evaluation\n", 1e6 * numpy);
    for (const auto& [name, times] :
         {std::pair("pixel engine ", by_pixels), std::pair("moment engine", by_moments)})
        fmt::print("  {}  {:10.2f} us, {:.0f} times the script\n",
                   name,
                   1e6 * bench::median(times),
                   numpy / bench::median(times));
}

void scan(const std::string& title, const std::vector<std::pair<int, double>>& cases) {
    fmt::print("{}, relative to nside 64 and 10^7 sources\n", title);
    double base = 0.0;
    for (const auto& [nside, sources] : cases) {
        Counts counts = bench::make_counts(nside, sources);
        const double begin = bench::cpu_seconds();
        const Posterior target(counts, bench::make_model(Engine::automatic));
        const double made = bench::cpu_seconds() - begin;
        const Eigen::MatrixXd walkers = typical_walkers(target);
        std::vector<double> times;
        for (int round = 0; round < n_rounds; ++round)
            times.push_back(time_once(target, walkers, 500));
        if (base == 0.0) base = bench::median(times);
        const auto answered = target.evaluations();
        fmt::print(
            "  nside {:3}, {:.0e} sources: {:.2f}   (moments and mode {:.2f} s; pixel engine "
            "{} of {})\n",
            nside,
            sources,
            bench::median(times) / base,
            made,
            answered[1].times,
            answered[0].times + answered[1].times);
    }
}

}  // namespace

int main() {
    compare_with_numpy();
    scan("cost of an evaluation against pixels",
         {{64, 1e7}, {32, 1e7}, {128, 1e7}, {256, 1e7}});
    scan("cost of an evaluation against sources", {{64, 1e7}, {64, 1e5}, {64, 1e6}, {64, 1e8}});
}
