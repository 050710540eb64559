// SPDX-License-Identifier: GPL-2.0-or-later
// The ensemble against densities whose moments are known in closed form.
#include <algorithm>
#include <catch2/catch.hpp>
#include <cmath>
#include <functional>
#include <string>
#include <vector>

#include "deviascope/ensemble/diagnostics.h"
#include "deviascope/ensemble/memory_sink.h"
#include "deviascope/ensemble/sampler.h"
#include "ensemble/split_chains.h"
#include "test_targets.h"

using namespace deviascope;
using namespace deviascope::test;

namespace {

constexpr KernelFractions stretch_alone{1.0, 0.0, 0.0};
constexpr KernelFractions differential_evolution_alone{0.0, 1.0, 0.0};
constexpr KernelFractions mixture{0.4, 0.6, 0.0};
constexpr KernelFractions independence_alone{0.0, 0.0, 1.0};
constexpr KernelFractions all_kernels{0.2, 0.3, 0.5};

/// Allowed distance from the truth in standard errors: about one false alarm in 150,000 checks.
constexpr double allowed_sigmas = 4.5;

struct Setup {
    KernelFractions kernels = mixture;
    int walkers = 0;
    int replicates = 4;
    std::int64_t max_steps = 0;
    std::int64_t store_every = 1;
};

struct Sampled {
    Outcome outcome;
    Draws draws;
};

/// Runs to max_steps, whatever the looks find.
Sampled sample_all(const Target& target, const Setup& setup) {
    EnsembleOptions options;
    options.seed = 20260817;
    options.kernels = setup.kernels;
    options.walkers = setup.walkers;
    options.replicates = setup.replicates;
    options.max_steps = setup.max_steps;
    options.store_every = setup.store_every;
    options.effective_draws = 1e12;
    options.threads = 2;
    MemorySink sink;
    Sampled sampled;
    sampled.outcome = sample(target, options, sink);
    sampled.draws = std::move(sink.draws);
    return sampled;
}

using Function = std::function<double(const double*)>;

struct Estimate {
    double mean, standard_error;
};

/// Mean over all draws; its error from the effective size of the function's own values.
Estimate estimate(const Draws& draws, const Function& function) {
    const Eigen::Index n_chains = draws.n_replicates * draws.n_walkers;
    std::vector<double> value;
    for (Eigen::Index row = draws.n_rows % 2; row < draws.n_rows; ++row)
        for (Eigen::Index chain = 0; chain < n_chains; ++chain)
            value.push_back(function(draws.row_of(row, 0, chain)));
    const auto n = static_cast<double>(value.size());
    double mean = 0.0;
    for (const double x : value) mean += x / n;
    double variance = 0.0;
    for (const double x : value) variance += (x - mean) * (x - mean) / n;
    const double size = split_effective_size({value, n_chains});
    return {mean, std::sqrt(variance / size)};
}

struct Moment {
    std::string name;
    Function function;
    double truth;
    double largest_error;  ///< the run must be long enough to mean something
};

void check_moments(const Draws& draws, const std::vector<Moment>& moments) {
    for (const Moment& moment : moments) {
        const Estimate found = estimate(draws, moment.function);
        CAPTURE(moment.name, found.mean, found.standard_error, moment.truth);
        CHECK(std::abs(found.mean - moment.truth) < allowed_sigmas * found.standard_error);
        CHECK(found.standard_error < moment.largest_error);
    }
}

double acceptance(const Outcome& outcome, Kernel kernel) {
    const auto index = static_cast<std::size_t>(kernel);
    return static_cast<double>(outcome.tally.taken[index]) /
           static_cast<double>(outcome.tally.tried[index]);
}

}  // namespace

TEST_CASE("the stretch move keeps the variance of a Gaussian in three dimensions",
          "[ensemble]") {
    // With the exponent of z one too large the variance comes out at 1.28, one too small 0.75
    // (computed with independent code): an error of 0.01 tells them apart by 25 sigma.
    const Sampled sampled = sample_all(
        ChainGaussian(3),
        {.kernels = stretch_alone, .walkers = 40, .max_steps = 8000, .store_every = 4});
    for (const int axis : {0, 1, 2})
        check_moments(
            sampled.draws,
            {{"mean", [=](const double* x) { return x[axis]; }, 0.0, 0.01},
             {"square", [=](const double* x) { return x[axis] * x[axis]; }, 1.0, 0.01}});
    // Same source: acceptance 0.646.
    CHECK(acceptance(sampled.outcome, Kernel::stretch) == Approx(0.646).margin(0.004));
}

TEST_CASE("walkers started from the exact density stay in it", "[ensemble]") {
    // At any one step the walkers are independent draws, so errors are exact:
    // var x^2 = 2, var x^4 = 96, var of a product of two coordinates = 1.
    for (const KernelFractions& kernels :
         {stretch_alone, differential_evolution_alone, mixture}) {
        const Sampled sampled = sample_all(ExactlyStartedGaussian(3),
                                           {.kernels = kernels,
                                            .walkers = 20,
                                            .replicates = 1000,
                                            .max_steps = 120,
                                            .store_every = 30});
        REQUIRE(sampled.draws.n_rows == 2);
        const Draws& draws = sampled.draws;
        double sum = 0.0, squares = 0.0, fourths = 0.0, products = 0.0;
        for (Eigen::Index chain = 0; chain < 20000; ++chain) {
            const double* x = draws.row_of(1, 0, chain);
            for (const int axis : {0, 1, 2}) {
                sum += x[axis];
                squares += x[axis] * x[axis] - 1.0;
                fourths += std::pow(x[axis], 4) - 3.0;
            }
            products += x[0] * x[1] + x[1] * x[2] + x[2] * x[0];
        }
        const double n = 60000.0;
        CHECK(std::abs(sum) < allowed_sigmas * std::sqrt(n));
        CHECK(std::abs(squares) < allowed_sigmas * std::sqrt(2.0 * n));
        CHECK(std::abs(fourths) < allowed_sigmas * std::sqrt(96.0 * n));
        CHECK(std::abs(products) < allowed_sigmas * std::sqrt(n));
    }
}

TEST_CASE("each kernel and the mixture sample a correlated Gaussian in 20 dimensions",
          "[ensemble]") {
    // Covariance 0.9^|i-j|, as in Huijser, Goodman & Brewer 2015, arXiv 1509.02230 (number of
    // the paper from memory). Walkers start from another density.
    const std::vector<Moment> moments = {
        {"x0", [](const double* x) { return x[0]; }, 0.0, 0.05},
        {"x19", [](const double* x) { return x[19]; }, 0.0, 0.05},
        {"x0^2", [](const double* x) { return x[0] * x[0]; }, 1.0, 0.07},
        {"x10^2", [](const double* x) { return x[10] * x[10]; }, 1.0, 0.07},
        {"x0 x1", [](const double* x) { return x[0] * x[1]; }, 0.9, 0.07},
        {"x0 x19", [](const double* x) { return x[0] * x[19]; }, std::pow(0.9, 19), 0.05}};
    for (const KernelFractions& kernels :
         {stretch_alone, differential_evolution_alone, mixture}) {
        const Sampled sampled =
            sample_all(ChainGaussian(20, 0.9),
                       {.kernels = kernels, .max_steps = 16000, .store_every = 40});
        check_moments(sampled.draws, moments);
    }
}

TEST_CASE("the moments of the Rosenbrock density come out", "[ensemble]") {
    // x0 ~ Normal(1, variance 10), x1 given x0 ~ Normal(x0^2, variance 0.1): closed forms,
    // confirmed by quadrature. Autocorrelation times are above 1000 steps.
    const Sampled sampled =
        sample_all(Rosenbrock(), {.walkers = 100, .max_steps = 40000, .store_every = 100});
    check_moments(
        sampled.draws,
        {{"x0", [](const double* x) { return x[0]; }, 1.0, 0.1},
         {"x1", [](const double* x) { return x[1]; }, 11.0, 0.5},
         {"var x0", [](const double* x) { return std::pow(x[0] - 1.0, 2); }, 10.0, 0.5},
         {"var x1", [](const double* x) { return std::pow(x[1] - 11.0, 2); }, 240.1, 25.0},
         {"cov", [](const double* x) { return (x[0] - 1.0) * (x[1] - 11.0); }, 20.0, 3.0},
         // Median of x1, by quadrature.
         {"P(x1 < 5.03104902)",
          [](const double* x) { return x[1] < 5.03104902 ? 1.0 : 0.0; },
          0.5,
          0.02}});
}

TEST_CASE("hard walls: the uniform ball in five dimensions", "[ensemble]") {
    const auto radius_to = [](double power) {
        return [power](const double* x) {
            double square = 0.0;
            for (int axis = 0; axis < 5; ++axis) square += x[axis] * x[axis];
            return std::pow(square, 0.5 * power);
        };
    };
    for (const KernelFractions& kernels :
         {stretch_alone, differential_evolution_alone, mixture}) {
        const Sampled sampled = sample_all(
            UniformBall(5), {.kernels = kernels, .max_steps = 8000, .store_every = 10});
        check_moments(
            sampled.draws,
            {{"r", radius_to(1.0), 5.0 / 6.0, 0.002},
             {"r^2", radius_to(2.0), 5.0 / 7.0, 0.003},
             {"r^10", radius_to(10.0), 1.0 / 3.0, 0.006},
             {"x0", [](const double* x) { return x[0]; }, 0.0, 0.01},
             {"x3^2", [](const double* x) { return x[3] * x[3]; }, 1.0 / 7.0, 0.003}});
    }
}

TEST_CASE("a bent density has the moments of its bend", "[ensemble]") {
    // x3 = y + c (x0^2 - 1), y and x0 standard normal: var x3 = 1 + 2 c^2, cov(x3, x0^2) = 2 c.
    constexpr double bend = 1.5;
    const Sampled sampled =
        sample_all(Curved(4, bend), {.max_steps = 16000, .store_every = 20});
    check_moments(
        sampled.draws,
        {{"x0^2", [](const double* x) { return x[0] * x[0]; }, 1.0, 0.03},
         {"x3", [](const double* x) { return x[3]; }, 0.0, 0.05},
         {"x3^2", [](const double* x) { return x[3] * x[3]; }, 1.0 + 2.0 * bend * bend, 0.3},
         {"x3 x0^2", [](const double* x) { return x[3] * x[0] * x[0]; }, 2.0 * bend, 0.2},
         {"x1 x3", [](const double* x) { return x[1] * x[3]; }, 0.0, 0.06}});
}

TEST_CASE("independence alone and all kernels leave curved and two-lobed densities invariant",
          "[ensemble]") {
    // The approximation is deliberately poor: off centre, too narrow along one axis, correlated
    // where the density is not.
    Eigen::VectorXd mean(4);
    mean << 0.3, -0.2, 0.0, 0.5;
    Eigen::MatrixXd factor = Eigen::MatrixXd::Identity(4, 4);
    factor(1, 0) = 0.3;
    factor(3, 0) = -0.2;
    factor(3, 3) = 2.0;
    constexpr double bend = 0.6;
    const Curved curved(4, bend);
    const Approximated target(curved, {mean, factor});
    for (const KernelFractions& kernels : {independence_alone, all_kernels}) {
        const Sampled sampled =
            sample_all(target, {.kernels = kernels, .max_steps = 16000, .store_every = 20});
        CHECK(sampled.outcome.tally.tried[2] > 0);
        CHECK(acceptance(sampled.outcome, Kernel::independence) > 0.1);
        check_moments(
            sampled.draws,
            {{"x0", [](const double* x) { return x[0]; }, 0.0, 0.03},
             {"x0^2", [](const double* x) { return x[0] * x[0]; }, 1.0, 0.05},
             {"x3^2",
              [](const double* x) { return x[3] * x[3]; },
              1.0 + 2.0 * bend * bend,
              0.1},
             {"x3 x0^2", [](const double* x) { return x[3] * x[0] * x[0]; }, 2.0 * bend, 0.1},
             {"x1 x3", [](const double* x) { return x[1] * x[3]; }, 0.0, 0.05}});
    }
    const TwoLobes lobes(2, 6.0);
    Eigen::VectorXd between(2);
    between << 0.5, 0.1;
    Eigen::MatrixXd wide = Eigen::MatrixXd::Identity(2, 2);
    wide(0, 0) = 3.0;
    const Approximated lobed(lobes, {between, wide});
    for (const KernelFractions& kernels : {independence_alone, all_kernels}) {
        const Sampled sampled =
            sample_all(lobed, {.kernels = kernels, .max_steps = 8000, .store_every = 10});
        check_moments(
            sampled.draws,
            {{"right", [](const double* x) { return x[0] > 0.0 ? 1.0 : 0.0; }, 0.5, 0.02},
             {"x0^2", [](const double* x) { return x[0] * x[0]; }, 10.0, 0.1},
             {"x1^2", [](const double* x) { return x[1] * x[1]; }, 1.0, 0.02}});
    }
}

namespace {

/// Stationary AR(1) series of unit variance, one parameter.
Draws autoregressive_rows(double rho, Eigen::Index n_rows, Eigen::Index n_walkers) {
    Draws draws;
    draws.n_rows = n_rows;
    draws.n_replicates = 2;
    draws.n_walkers = n_walkers;
    draws.n_parameters = 1;
    std::vector<double> x(static_cast<std::size_t>(2 * n_walkers));
    Stream stream(20260817,
                  Purpose::test,
                  static_cast<std::uint64_t>(100 * rho),
                  static_cast<std::uint64_t>(n_walkers),
                  0);
    for (double& start : x) start = normal(stream);
    for (Eigen::Index row = 0; row < n_rows; ++row)
        for (double& at : x) {
            at = rho * at + std::sqrt(1.0 - rho * rho) * normal(stream);
            draws.value.push_back(at);
        }
    return draws;
}

const MonitoredScalar first_parameter{"x0", MonitoredScalar::Kind::parameter, 0, 0};

/// What the estimate tends to with ever more AR(1) chains of halves of n draws: the estimator's
/// own sum over the exact expectations of acov_t (mean taken off, divisor n) and var+. It is
/// not tau: each chain's mean eats a share tau / n of its variance.
double limit_for_many_chains(double rho, int n) {
    std::vector<double> with_mean(static_cast<std::size_t>(n));  // cov(x_i, mean)
    double variance_of_mean = 0.0;
    for (int i = 0; i < n; ++i) {
        double& c = with_mean[static_cast<std::size_t>(i)];
        for (int j = 0; j < n; ++j) c += std::pow(rho, std::abs(i - j)) / n;
        variance_of_mean += c / n;
    }
    const auto autocovariance = [&](int lag) {
        double sum = 0.0;
        for (int i = 0; i + lag < n; ++i)
            sum += std::pow(rho, lag) - with_mean[static_cast<std::size_t>(i)] -
                   with_mean[static_cast<std::size_t>(i + lag)] + variance_of_mean;
        return sum / n;
    };
    const double within = autocovariance(0) * n / (n - 1);
    const double total = autocovariance(0) + variance_of_mean;
    double sum = 0.0, smallest = 2.0;
    for (int lag = 0; lag + 1 < n; lag += 2) {
        const double even = lag == 0 ? 1.0 : 1.0 - (within - autocovariance(lag)) / total;
        const double pair = even + 1.0 - (within - autocovariance(lag + 1)) / total;
        if (pair <= 0.0) break;
        smallest = std::min(smallest, pair);
        sum += smallest;
    }
    return 2.0 * sum - 1.0;
}

}  // namespace

TEST_CASE("autocorrelation times of long AR(1) series are found", "[ensemble]") {
    // tau = (1 + rho) / (1 - rho); the error of an estimate from n draws with a window of
    // M = 5 tau is tau sqrt(2 (2M + 1) / n) (Sokal 1997, from memory). Four series, each many
    // hundred tau long, so that what the means eat is far below that error.
    constexpr Eigen::Index n_rows = 128000;
    constexpr double n = 4.0 * n_rows;
    for (const double rho : {0.0, 0.5, 0.9, 0.99}) {
        const ScalarDiagnostics found =
            diagnose(first_parameter, autoregressive_rows(rho, n_rows, 2), 3);
        const double tau = (1.0 + rho) / (1.0 - rho);
        const double error = tau * std::sqrt(2.0 * (10.0 * tau + 1.0) / n);
        CAPTURE(rho, found.autocorrelation_steps / 3.0, error);
        CHECK(std::abs(found.autocorrelation_steps / 3.0 - tau) < allowed_sigmas * error);
        CHECK(found.bulk == Approx(3.0 * n / found.autocorrelation_steps));
    }
}

TEST_CASE("autocorrelation times of many short AR(1) series have their known bias",
          "[ensemble]") {
    // 2000 series of 20 tau. The sum may run over all lags of a half, which sets the error.
    constexpr Eigen::Index n_chains = 2000;
    for (const double rho : {0.5, 0.9, 0.95}) {
        const double tau = (1.0 + rho) / (1.0 - rho);
        const int half = static_cast<int>(10.0 * tau + 0.5);
        const Draws draws = autoregressive_rows(rho, 2 * half, n_chains / 2);
        const Eigen::Map<const Eigen::MatrixXd> by_row(draws.value.data(), n_chains, 2 * half);
        const double n = static_cast<double>(2 * half * n_chains);
        const double found = n / effective_draws(by_row.transpose()).bulk;
        const double expected = limit_for_many_chains(rho, half);
        const double error = tau * std::sqrt(2.0 * (2.0 * half + 1.0) / n);
        CAPTURE(rho, found, expected, error);
        CHECK(std::abs(found - expected) < allowed_sigmas * error);
        // Within a factor 1.5 of the truth either way.
        CHECK(expected < 1.5 * tau);
        CHECK(expected > tau / 1.5);
    }
}

TEST_CASE("lobes that no walker leaves are reported as not converged", "[ensemble]") {
    const TwoLobes target(20, 20.0);
    EnsembleOptions options;
    options.seed = 20260817;
    options.max_steps = 4000;
    options.effective_draws = 100.0;
    options.threads = 2;
    MemorySink sink;
    const Outcome outcome = sample(target, options, sink);
    CHECK(outcome.end == Outcome::End::max_steps);
    CHECK_FALSE(outcome.warm_up_settled);
    const ScalarDiagnostics found = diagnose(
        {"x0", MonitoredScalar::Kind::parameter, 0, 0}, sink.draws, outcome.store_every);
    CHECK(found.walker_rhat > 1.5);
    // The rest of the coordinates mix well enough.
    CHECK(diagnose(
              {"x1", MonitoredScalar::Kind::parameter, 1, 0}, sink.draws, outcome.store_every)
              .walker_rhat < 1.1);
}

TEST_CASE("lobes within reach of a jump are sampled with their true weights", "[ensemble]") {
    // In two dimensions the full step of differential evolution carries walkers across.
    const Sampled sampled =
        sample_all(TwoLobes(2, 12.0), {.max_steps = 8000, .store_every = 10});
    check_moments(sampled.draws,
                  {{"right", [](const double* x) { return x[0] > 0.0 ? 1.0 : 0.0; }, 0.5, 0.02},
                   {"x0^2", [](const double* x) { return x[0] * x[0]; }, 37.0, 0.2},
                   {"x1^2", [](const double* x) { return x[1] * x[1]; }, 1.0, 0.02}});
}

TEST_CASE("a run is the same in coordinates scaled by a power of two", "[ensemble]") {
    // Goodman & Weare 2010: the ensemble commutes with affine maps. Powers of two round alike,
    // so the run must agree to the last bit, looks and intervals included.
    const ChainGaussian plain(4, 0.8);
    EnsembleOptions options;
    options.seed = 20260817;
    options.max_steps = 4000;
    options.effective_draws = 3000;
    MemorySink expected;
    const Outcome outcome = sample(plain, options, expected);
    CHECK(outcome.end == Outcome::End::converged);
    for (const double scale : {std::ldexp(1.0, -20), 1024.0}) {
        MemorySink found;
        const Outcome scaled = sample(Scaled(plain, scale), options, found);
        CHECK(scaled.steps == outcome.steps);
        CHECK(scaled.store_every == outcome.store_every);
        REQUIRE(found.draws.value.size() == expected.draws.value.size());
        CHECK(std::equal(found.draws.value.begin(),
                         found.draws.value.end(),
                         expected.draws.value.begin(),
                         [&](double a, double b) { return a == b * scale; }));
        CHECK(found.draws.log_posterior == expected.draws.log_posterior);
    }
}

TEST_CASE("a run is nearly the same in coordinates scaled by any factor", "[ensemble]") {
    // Rounding differs and grows until it flips a decision: 20 steps agree to 1e-12.
    const ChainGaussian plain(4, 0.8);
    constexpr double scale = 0.0123;
    const Sampled expected = sample_all(plain, {.max_steps = 20});
    const Sampled found = sample_all(Scaled(plain, scale), {.max_steps = 20});
    REQUIRE(found.draws.value.size() == expected.draws.value.size());
    for (std::size_t at = 0; at < found.draws.value.size(); ++at)
        REQUIRE(found.draws.value[at] / scale ==
                Approx(expected.draws.value[at]).margin(1e-11).epsilon(1e-12));
}
