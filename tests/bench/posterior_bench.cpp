// SPDX-License-Identifier: GPL-2.0-or-later
// How many times faster the posterior is than a plain NumPy script of the same posterior
// (tests/reference/numpy_posterior), on one core, in CPU time, taken in turns in one run.
#include <fmt/format.h>

#include <algorithm>
#include <ctime>
#include <limits>
#include <string>
#include <vector>

#include "deviascope/model/posterior.h"
#include "python_check.h"
#include "reference_problem.h"

namespace {

constexpr int n_rounds = 7;
constexpr Eigen::Index n_walkers = 32;

/// CPU seconds per evaluation of a block of walkers.
double time_once(const deviascope::Posterior& target, const Eigen::MatrixXd& walkers) {
    Eigen::VectorXd posterior(walkers.cols()), likelihood(walkers.cols());
    const std::clock_t begin = std::clock();
    target.log_density(walkers, posterior, likelihood);
    const double ticks = static_cast<double>(std::clock() - begin);
    return ticks / CLOCKS_PER_SEC / static_cast<double>(walkers.cols());
}

/// A block about the prior means, with dipoles of a given size; the velocity a fifth of it.
Eigen::MatrixXd make_walkers(Eigen::Index n_coordinates, double size) {
    Eigen::MatrixXd walkers(n_coordinates, n_walkers);
    for (Eigen::Index w = 0; w < n_walkers; ++w) {
        deviascope::Stream stream(
            1, deviascope::Purpose::test, 0, static_cast<std::uint64_t>(w), 0);
        const deviascope::VectorPrior ball("ball", deviascope::UniformVectorPrior{size});
        walkers.col(w).head<3>() = 0.2 * ball.draw(stream);
        for (const Eigen::Index first : {3, 6, 9})
            walkers.col(w).segment<3>(first) = ball.draw(stream);
        for (std::size_t s = 0; s < reference_problem::n_surveys; ++s)
            for (std::size_t b = 0; b < reference_problem::n_bins; ++b)
                walkers(static_cast<Eigen::Index>(12 + reference_problem::n_bins * s + b), w) =
                    reference_problem::weight_mean(s, b) + 0.1 * deviascope::normal(stream);
    }
    return walkers;
}

double median(std::vector<double> values) {
    std::sort(values.begin(), values.end());
    return values[values.size() / 2];
}

}  // namespace

int main() {
    const deviascope::Posterior target(reference_problem::make_counts(),
                                       reference_problem::make_model());
    const std::string script = DEVIASCOPE_TEST_DATA "/reference/numpy_posterior/posterior.py";
    const std::vector<double> sizes = {0.007, 0.05, 0.2};
    std::vector<std::vector<double>> ours(sizes.size());
    std::vector<double> numpy;
    for (int round = 0; round < n_rounds; ++round) {
        for (std::size_t k = 0; k < sizes.size(); ++k)
            ours[k].push_back(
                time_once(target, make_walkers(target.n_coordinates(), sizes[k])));
        numpy.push_back(std::stod(deviascope::test::run_python(script, {"--time"}).output));
    }
    fmt::print("NumPy script: {:.3f} ms an evaluation (CPU time, median of {} rounds)\n",
               1e3 * median(numpy),
               n_rounds);
    for (std::size_t k = 0; k < sizes.size(); ++k)
        fmt::print("pixel engine, dipoles up to {}: {:.3f} ms, {:.1f} times faster\n",
                   sizes[k],
                   1e3 * median(ours[k]),
                   median(numpy) / median(ours[k]));
}
