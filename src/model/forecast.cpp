// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/model/forecast.h"

#include <Eigen/Eigenvalues>
#include <cmath>
#include <limits>
#include <numeric>

#include "deviascope/model/information.h"
#include "model/prior_information.h"

namespace deviascope {
namespace {

/// Counts and priors on vectors and weights (first), and the counts on ln monopoles (last).
struct Total {
    Eigen::MatrixXd information;
    Eigen::MatrixXd prior;  ///< of that, zero for the monopoles
};

Total total_information(const Counts& counts, const ParameterSpace& space) {
    const FreeParameters parameters(counts, space);
    const Eigen::VectorXd origin = Eigen::VectorXd::Zero(parameters.size());
    const Eigen::Index n_monopoles = std::ssize(space.terms());
    Eigen::VectorXd row = parameters.row_at(origin);
    row.tail(n_monopoles).setConstant(std::numeric_limits<double>::quiet_NaN());  // maxima
    const bool sampled = space.options().monopole.sampled;
    const Eigen::Index n_moved = space.n_coordinates() - (sampled ? n_monopoles : 0);
    const Eigen::Index n = n_moved + n_monopoles;
    Eigen::MatrixXd to_row = Eigen::MatrixXd::Zero(space.n_parameters(), n);
    to_row.leftCols(n_moved) = parameters.directions().leftCols(n_moved);
    for (Eigen::Index term = 0; term < n_monopoles; ++term)
        to_row(space.terms()[static_cast<std::size_t>(term)].monopole, n_moved + term) = 1.0;
    Total total;
    total.prior = Eigen::MatrixXd::Zero(n, n);
    total.prior.topLeftCorner(n_moved, n_moved) =
        (prior_expansion(parameters, origin).information + bounded_information(parameters))
            .topLeftCorner(n_moved, n_moved);
    total.information =
        to_row.transpose() * expected_information(counts, space, row) * to_row + total.prior;
    return total;
}

constexpr double most_of_the_prior = 0.8;

/// Root mean square of the standard deviations; infinite where a direction is not determined.
double sd_of(const Eigen::MatrixXd& information, double least) {
    const Eigen::SelfAdjointEigenSolver<Eigen::MatrixXd> solver(information,
                                                                Eigen::EigenvaluesOnly);
    if (solver.eigenvalues().minCoeff() <= least)
        return std::numeric_limits<double>::infinity();
    return std::sqrt(solver.eigenvalues().cwiseInverse().mean());
}

bool is_measurement(const VectorPrior& prior) {
    const auto* gaussian = std::get_if<GaussianPrior>(&prior.kind());
    return gaussian != nullptr && !gaussian->mean.isZero(0.0);
}

VectorForecast forecast_of(const Total& total, const ParameterSpace& space, std::size_t v) {
    VectorForecast one;
    one.name = space.vectors()[v].name;
    one.n_free = space.vector_prior(v).n_coordinates();
    if (one.n_free == 0) return one;
    const Eigen::Index first = space.vector_places()[v].coordinate;
    std::vector<Eigen::Index> keep(static_cast<std::size_t>(one.n_free)), rest;
    std::iota(keep.begin(), keep.end(), first);
    for (Eigen::Index i = 0; i < total.information.rows(); ++i)
        if (i < first || i >= first + one.n_free) rest.push_back(i);
    const Eigen::MatrixXd with_prior = eliminate(total.information, keep, rest);
    const Eigen::MatrixXd prior = total.prior.block(first, first, one.n_free, one.n_free);
    one.expected_sd = sd_of(with_prior, 0.0);
    one.prior_sd = sd_of(prior, 0.0);
    // What is left of a difference of equal numbers is no information.
    constexpr double rounding = 1e-9;
    one.counts_sd = sd_of(with_prior - prior, rounding * with_prior.trace());
    one.prior_rules = !is_measurement(space.vector_prior(v)) &&
                      one.expected_sd > most_of_the_prior * one.prior_sd;
    return one;
}

}  // namespace

std::vector<VectorForecast> forecast(const Counts& counts, const ParameterSpace& space) {
    const Total total = total_information(counts, space);
    std::vector<VectorForecast> all;
    for (std::size_t v = 0; v < space.vectors().size(); ++v)
        all.push_back(forecast_of(total, space, v));
    return all;
}

}  // namespace deviascope
