// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/model/posterior.h"

#include <boost/random/gamma_distribution.hpp>
#include <cmath>
#include <limits>
#include <vector>

#include "deviascope/core/error.h"
#include "deviascope/model/pixel_engine.h"
#include "model/bin_likelihood.h"
#include "model/start_gaussian.h"

namespace deviascope {
namespace {

constexpr double minus_infinity = -std::numeric_limits<double>::infinity();

}  // namespace

struct Posterior::Parts {
    Parts(const Counts& counts, const ModelOptions& options)
        : space(counts, options),
          totals(totals_of(counts, space)),
          engine(counts, space),
          start(counts, space) {}

    /// Sums of bins for a block of rows, all inside the walls.
    struct BinSums {
        Eigen::MatrixXd counted, log_expected;  ///< n_terms x n_walkers
    };
    BinSums sums(const Eigen::Ref<const Eigen::MatrixXd>& rows) const {
        const Eigen::Index n = std::ssize(totals);
        BinSums all{Eigen::MatrixXd(n, rows.cols()), Eigen::MatrixXd(n, rows.cols())};
        engine.sums(rows, all.counted, all.log_expected);
        return all;
    }

    /// ln L of one walker: bins added in job order.
    double log_likelihood(const Eigen::Ref<const Eigen::VectorXd>& row,
                          const Eigen::Ref<const Eigen::VectorXd>& counted,
                          const Eigen::Ref<const Eigen::VectorXd>& log_expected) const {
        const MonopolePrior& prior = space.options().monopole;
        double sum = 0.0;
        for (Eigen::Index t = 0; t < counted.size(); ++t) {
            const auto bin = static_cast<std::size_t>(t);
            sum += prior.sampled ? sampled_log_likelihood(totals[bin],
                                                          row[space.terms()[bin].monopole],
                                                          counted[t],
                                                          log_expected[t])
                                 : integrated_log_likelihood(
                                       totals[bin], prior, counted[t], log_expected[t]);
        }
        return sum;
    }

    ParameterSpace space;
    std::vector<BinTotals> totals;
    PixelEngine engine;
    StartGaussian start;
};

Posterior::Posterior(const Counts& counts, const ModelOptions& options)
    : parts_(std::make_unique<Parts>(counts, options)) {}
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
    const Parts::BinSums sums = parts_->sums(rows);
    for (Eigen::Index row = 0; row < rows.cols(); ++row) {
        const Eigen::Index walker = inside[static_cast<std::size_t>(row)];
        log_likelihood[walker] = parts_->log_likelihood(
            rows.col(row), sums.counted.col(row), sums.log_expected.col(row));
        log_posterior[walker] += log_likelihood[walker];
    }
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
    const Parts::BinSums sums = parts_->sums(parameters);
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
    parts_->start.draw(stream, coordinates);
}

}  // namespace deviascope
