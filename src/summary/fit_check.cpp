// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/summary/fit_check.h"

#include <algorithm>
#include <boost/math/special_functions/gamma.hpp>
#include <cmath>
#include <numeric>
#include <vector>

#include "deviascope/core/parallel.h"
#include "deviascope/core/random.h"
#include "deviascope/model/expected_counts.h"
#include "deviascope/model/information.h"
#include "deviascope/summary/significance.h"
#include "summary/draw_moments.h"
#include "summary/residual_power.h"

namespace deviascope {
namespace {

constexpr std::size_t n_largest = 5;
constexpr double doubtful_probability = 1e-3;

/// Cumulants of Pearson's chi-square over Poisson pixels, but for the mean.
struct PearsonMoments {
    double variance = 0.0, third = 0.0;
};

PearsonMoments pearson_moments(const std::vector<double>& expected) {
    PearsonMoments moments;
    for (const double lambda : expected) {
        const double inverse = 1.0 / lambda;
        moments.variance += 2.0 + inverse;
        moments.third += 8.0 + inverse * (22.0 + inverse);
    }
    return moments;
}

/// Probability of more than x under a gamma density shifted to given moments.
double exceedance(double x, double mean, const PearsonMoments& moments) {
    const double sd = std::sqrt(moments.variance);
    const double shape = 4.0 * std::pow(moments.variance, 3) / std::pow(moments.third, 2);
    const double at = shape + std::sqrt(shape) * (x - mean) / sd;
    return at > 0.0 ? boost::math::gamma_q(shape, at) : 1.0;
}

/// Pearson's sum, and the standard error of its mean from the scatter of its terms.
struct PearsonSum {
    double chi2 = 0.0, sd_of_mean = 0.0;
};

PearsonSum pearson_sum(const std::vector<std::uint32_t>& count,
                       const std::vector<double>& expected) {
    double sum = 0.0, square = 0.0;
    for (std::size_t p = 0; p < count.size(); ++p) {
        const double offset = static_cast<double>(count[p]) - expected[p];
        const double term = offset * offset / expected[p];
        sum += term;
        square += term * term;
    }
    const auto n = static_cast<double>(count.size());
    const double variance = std::max(square / n - sum * sum / (n * n), 0.0);
    return {sum, std::sqrt(variance / n)};
}

/// Parameters that the bin's own counts determine: its monopole, and tr(I_b Sigma).
double determined(const Counts& counts,
                  const ParameterSpace& space,
                  const BinTerm& term,
                  const Eigen::VectorXd& mean,
                  const Eigen::MatrixXd& covariance) {
    const Eigen::MatrixXd information =
        bin_information(counts, term, space.n_parameters(), mean);
    std::vector<Eigen::Index> rest;
    for (Eigen::Index p = 0; p < space.n_parameters(); ++p)
        if (space.parameters()[static_cast<std::size_t>(p)].role == Role::sampled &&
            p != term.monopole)
            rest.push_back(p);
    const Eigen::MatrixXd kept = eliminate(information, rest, {term.monopole});
    return 1.0 + (kept * covariance(rest, rest)).trace();
}

/// Two-sided level of a Poisson count; below 0 for too few.
double poisson_sigma(std::int64_t count, double expected) {
    const auto n = static_cast<double>(count);
    const double as_many = count > 0 ? boost::math::gamma_p(n, expected) : 1.0;
    const double as_few = boost::math::gamma_q(n + 1.0, expected);
    const double p = std::min(1.0, 2.0 * std::min(as_many, as_few));
    const double sigma =
        p > 0.0 ? sigma_of_probability(p) : std::abs(n - expected) / std::sqrt(expected);
    return as_many < as_few ? sigma : -sigma;
}

std::vector<ResidualPixel> largest_residuals(const Footprint& footprint,
                                             const BinCounts& bin,
                                             const std::vector<double>& expected,
                                             const Pixelisation& grid) {
    std::vector<double> sigma(expected.size());
    for (std::size_t p = 0; p < sigma.size(); ++p)
        sigma[p] = poisson_sigma(bin.count[p], expected[p]);
    std::vector<std::size_t> order(sigma.size());
    std::iota(order.begin(), order.end(), std::size_t{0});
    const auto n = static_cast<std::ptrdiff_t>(std::min(n_largest, order.size()));
    std::partial_sort(
        order.begin(), order.begin() + n, order.end(), [&](std::size_t a, std::size_t b) {
            const double one = std::abs(sigma[a]), other = std::abs(sigma[b]);
            return one != other ? one > other : a < b;
        });
    std::vector<ResidualPixel> largest;
    for (auto at = order.begin(); at != order.begin() + n; ++at)
        largest.push_back({footprint.pixel[*at],
                           grid.centre(footprint.pixel[*at]),
                           bin.count[*at],
                           expected[*at],
                           sigma[*at]});
    return largest;
}

FitCheck check_bin(const Counts& counts,
                   const ParameterSpace& space,
                   const BinTerm& term,
                   const Eigen::VectorXd& mean,
                   const Eigen::MatrixXd& covariance) {
    const SurveyCounts& survey = counts.surveys[term.survey];
    const BinCounts& bin = survey.bins[term.bin];
    const Footprint& footprint = survey.footprints[bin.footprint];
    const std::vector<double> expected = expected_counts(counts, term, mean);
    const PearsonSum sum = pearson_sum(bin.count, expected);
    const double phi = term.dispersion;
    FitCheck check;
    check.survey = survey.name;
    check.bin = bin.name;
    check.assumed_dispersion = phi;
    check.chi2 = sum.chi2;
    check.degrees = static_cast<double>(expected.size()) -
                    determined(counts, space, term, mean, covariance);
    check.dispersion = sum.chi2 / check.degrees;
    check.dispersion_sd = sum.sd_of_mean;
    check.probability = exceedance(sum.chi2 / phi, check.degrees, pearson_moments(expected));
    check.largest = largest_residuals(footprint, bin, expected, Pixelisation(counts.nside));
    check.power = residual_power(footprint, bin, expected, Pixelisation(counts.nside));
    for (ResidualPower& power : check.power) {
        power.chi2 /= phi;
        power.probability = exceedance_of_chi_square(power.chi2, 2.0 * power.multipole + 1.0);
    }
    return check;
}

/// Rows of parameters drawn from the posterior's Gaussian.
Eigen::MatrixXd rows_about_mode(const Posterior& posterior, std::uint64_t seed) {
    constexpr Eigen::Index n_draws = 1000;
    const CoordinateGaussian& gaussian = *posterior.approximation();
    Eigen::MatrixXd coordinates(posterior.n_coordinates(), n_draws);
    for (Eigen::Index draw = 0; draw < n_draws; ++draw) {
        Stream stream(seed, Purpose::laplace_draw, 1, static_cast<std::uint64_t>(draw), 0);
        Eigen::VectorXd standard(posterior.n_coordinates());
        for (double& one : standard) one = normal(stream);
        coordinates.col(draw) = gaussian.mean + gaussian.factor * standard;
    }
    Eigen::MatrixXd rows(posterior.space().n_parameters(), n_draws);
    posterior.to_parameters(coordinates, rows);
    return rows;
}

}  // namespace

std::vector<FitCheck> check_fit(const Counts& counts,
                                const ParameterSpace& space,
                                const Eigen::VectorXd& mean,
                                const Eigen::MatrixXd& covariance,
                                int threads) {
    std::vector<FitCheck> checks(space.terms().size());
    parallel_for(checks.size(), threads, [&](std::size_t term) {
        checks[term] = check_bin(counts, space, space.terms()[term], mean, covariance);
    });
    return checks;
}

std::vector<FitCheck> check_fit_at_mode(const Counts& counts,
                                        const Posterior& posterior,
                                        std::uint64_t seed) {
    const DrawMoments moments = moments_of(rows_about_mode(posterior, seed));
    return check_fit(counts, posterior.space(), moments.mean, moments.covariance, 1);
}

bool is_over_dispersed(const FitCheck& check) {
    return check.probability < doubtful_probability;
}

bool is_under_dispersed(const FitCheck& check) {
    return check.probability > 1.0 - doubtful_probability;
}

}  // namespace deviascope
