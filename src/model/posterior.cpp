// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/model/posterior.h"

#include <atomic>
#include <boost/random/gamma_distribution.hpp>
#include <cmath>
#include <limits>
#include <vector>

#include "deviascope/core/error.h"
#include "model/bin_likelihood.h"
#include "model/engines.h"
#include "model/laplace.h"

namespace deviascope {
namespace {

constexpr double minus_infinity = -std::numeric_limits<double>::infinity();

}  // namespace

struct Posterior::Parts {
    Parts(const Counts& counts, const ModelOptions& options, std::uint64_t seed)
        : space(counts, options),
          totals(totals_of(counts, space)),
          engines(counts, space),
          laplace(counts, space, engines, seed) {}

    ParameterSpace space;
    std::vector<BinTotals> totals;
    Engines engines;
    Laplace laplace;
    mutable std::atomic<std::int64_t> by_moments = 0, by_pixels = 0;
};

Posterior::Posterior(const Counts& counts, const ModelOptions& options, std::uint64_t seed)
    : parts_(std::make_unique<Parts>(counts, options, seed)) {}
Posterior::~Posterior() = default;

const ParameterSpace& Posterior::space() const {
    return parts_->space;
}
const std::vector<Parameter>& Posterior::parameters() const {
    return space().parameters();
}
const std::vector<VectorParameter>& Posterior::vectors() const {
    return space().vectors();
}
Eigen::Index Posterior::n_coordinates() const {
    return space().n_coordinates();
}

void Posterior::log_density(const Eigen::Ref<const Eigen::MatrixXd>& coordinates,
                            Eigen::Ref<Eigen::VectorXd> log_posterior,
                            Eigen::Ref<Eigen::VectorXd> log_likelihood) const {
    Eigen::MatrixXd rows(space().n_parameters(), coordinates.cols());
    std::vector<Eigen::Index> inside;  // only these need the map
    for (Eigen::Index walker = 0; walker < coordinates.cols(); ++walker) {
        const auto row = std::ssize(inside);
        space().to_parameters(coordinates.col(walker), rows.col(row));
        log_posterior[walker] = space().log_prior(coordinates.col(walker));
        log_likelihood[walker] = minus_infinity;
        if (log_posterior[walker] == minus_infinity) continue;
        if (space().is_inside_walls(rows.col(row)))
            inside.push_back(walker);
        else
            log_posterior[walker] = minus_infinity;
    }
    rows.conservativeResize(Eigen::NoChange, std::ssize(inside));
    const Engines::Sums sums = parts_->engines.sums(rows);
    for (Eigen::Index row = 0; row < rows.cols(); ++row) {
        const Eigen::Index walker = inside[static_cast<std::size_t>(row)];
        log_likelihood[walker] =
            deviascope::log_likelihood(space(), parts_->totals, rows, sums, row);
        log_posterior[walker] += log_likelihood[walker];
    }
    parts_->by_moments.fetch_add(sums.by_moments, std::memory_order_relaxed);
    parts_->by_pixels.fetch_add(rows.cols() - sums.by_moments, std::memory_order_relaxed);
}

void Posterior::to_parameters(const Eigen::Ref<const Eigen::MatrixXd>& coordinates,
                              Eigen::Ref<Eigen::MatrixXd> parameters) const {
    for (Eigen::Index walker = 0; walker < coordinates.cols(); ++walker)
        space().to_parameters(coordinates.col(walker), parameters.col(walker));
}

void Posterior::redraw(std::span<Stream> streams,
                       Eigen::Ref<Eigen::MatrixXd> parameters) const {
    const MonopolePrior& prior = space().options().monopole;
    if (prior.sampled) return;
    ensure(std::ssize(streams) == parameters.cols(), "one stream a walker");
    const Engines::Sums sums = parts_->engines.sums(parameters);
    for (Eigen::Index walker = 0; walker < parameters.cols(); ++walker)
        for (std::size_t t = 0; t < parts_->totals.size(); ++t) {
            const BinTotals& bin = parts_->totals[t];
            const double log_expected = sums.log_expected(static_cast<Eigen::Index>(t), walker);
            const double rate = bin.exposed * std::exp(log_expected) + prior.rate;
            boost::random::gamma_distribution<double> gamma(bin.sources + prior.shape, 1.0);
            const double drawn = gamma(streams[static_cast<std::size_t>(walker)]);
            parameters(space().terms()[t].monopole, walker) = drawn / rate;
        }
}

void Posterior::draw_start(Stream& stream, Eigen::Ref<Eigen::VectorXd> coordinates) const {
    parts_->laplace.draw_start(stream, coordinates);
}

const CoordinateGaussian* Posterior::approximation() const {
    return n_coordinates() == 0 ? nullptr : &parts_->laplace.in_coordinates();
}

std::vector<EvaluationCount> Posterior::evaluations() const {
    return {{"moment", parts_->by_moments.load()}, {"pixel", parts_->by_pixels.load()}};
}

std::vector<std::string> Posterior::warnings() const {
    return parts_->laplace.warnings();
}

}  // namespace deviascope
