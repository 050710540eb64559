// SPDX-License-Identifier: GPL-2.0-or-later
#include "weights/scatter_free.h"

#include <Eigen/QR>
#include <algorithm>
#include <cmath>

#include "deviascope/core/parallel.h"
#include "deviascope/core/random.h"

namespace deviascope {

namespace {
constexpr std::array<double, 4> added_variances = {0.5, 1.0, 1.5, 2.0};
constexpr std::size_t rows_a_slice = 4096;
constexpr int most_replicates = 50;
}  // namespace

ScatterFreeTally::ScatterFreeTally(const Boxes& boxes,
                                   const SourcePhysics& physics,
                                   const WeighOptions& options,
                                   bool index_varies,
                                   bool weights_vary)
    : boxes_(boxes), options_(options) {
    for (const Dimension& dimension : boxes.dimension) {
        const auto known = physics.scatter.find(dimension.property);
        const bool counts =
            known != physics.scatter.end() && dimension.kind != Displaced::not_at_all;
        error_.push_back(counts ? known->second : PropertyError{});
    }
    if (!has_scatter()) return;
    TallyOptions tally{options.seed,
                       options.survey,
                       std::min(options.replicates, most_replicates),
                       options.threads,
                       index_varies,
                       weights_vary};
    for (const double lambda : added_variances)
        levels_.push_back({lambda, CrossingTally(boxes, tally)});
}

bool ScatterFreeTally::has_scatter() const {
    return std::ranges::any_of(error_, [](const PropertyError& e) { return e.amount > 0.0; });
}

/// Scatter in y of a source of a value.
double ScatterFreeTally::sd_of(std::size_t dimension, double value) const {
    const PropertyError& error = error_[dimension];
    switch (boxes_.dimension[dimension].kind) {
        case Displaced::redshift:
            return error.times_one_plus_z ? error.amount : error.amount / (1.0 + value);
        case Displaced::size:
            return error.amount / value;
        default:
            return error.amount;
    }
}

void ScatterFreeTally::add(const SourceBatch& batch) {
    const std::size_t n_rows = batch.kept.size();
    std::vector<std::vector<double>> displacement(error_.size());
    for (std::size_t d = 0; d < error_.size(); ++d)
        if (error_[d].amount > 0.0) displacement[d].resize(n_rows);
    parallel_for((n_rows + rows_a_slice - 1) / rows_a_slice, options_.threads, [&](auto slice) {
        const std::size_t end = std::min((slice + 1) * rows_a_slice, n_rows);
        for (std::size_t row = slice * rows_a_slice; row < end; ++row) {
            Stream stream(options_.seed,
                          Purpose::added_scatter,
                          static_cast<std::uint64_t>(batch.first_source) + row,
                          options_.survey,
                          0);
            for (std::size_t d = 0; d < error_.size(); ++d)
                if (error_[d].amount > 0.0)
                    displacement[d][row] = sd_of(d, batch.value[d][row]) * normal(stream);
        }
    });
    for (Level& level : levels_) {
        SourceBatch scattered = batch;
        std::vector<std::vector<double>> value(error_.size());
        for (std::size_t d = 0; d < error_.size(); ++d) {
            if (displacement[d].empty()) continue;
            const Displaced kind = boxes_.dimension[d].kind;
            for (std::size_t row = 0; row < n_rows; ++row)
                value[d].push_back(
                    value_at(kind,
                             coordinate_of(kind, batch.value[d][row]) +
                                 std::sqrt(level.lambda) * displacement[d][row]));
            scattered.value[d] = value[d];
        }
        level.tally.add(scattered);
    }
}

Eigen::MatrixXd ScatterFreeTally::weights(const WeightEstimator& observed,
                                          double one_plus_alpha) const {
    std::vector<WeightEstimator> estimators{observed};
    Eigen::MatrixXd powers(std::ssize(levels_) + 1, 3);
    powers.row(0) << 1.0, 0.0, 0.0;
    for (const Level& level : levels_) {
        powers.row(std::ssize(estimators)) << 1.0, level.lambda, level.lambda * level.lambda;
        estimators.emplace_back(boxes_, level.tally, one_plus_alpha, observed);
    }
    const auto parabolas = powers.colPivHouseholderQr();
    const std::size_t n_rows = 1 + levels_.front().tally.n_replicates();
    Eigen::MatrixXd free(n_rows, std::ssize(boxes_.box));
    parallel_for(n_rows, options_.threads, [&](std::size_t replicate) {
        Eigen::MatrixXd found(powers.rows(), free.cols());
        for (std::size_t at = 0; at < estimators.size(); ++at) {
            const auto weights = estimators[at].weights(replicate, WindowWidth::chosen);
            found.row(static_cast<Eigen::Index>(at)) =
                Eigen::RowVectorXd::Map(weights.data(), std::ssize(weights));
        }
        const Eigen::MatrixXd parabola = parabolas.solve(found);
        free.row(static_cast<Eigen::Index>(replicate)) =
            parabola.row(0) - parabola.row(1) + parabola.row(2);
    });
    return free;
}

ScatterShift shift_of_velocity(const std::vector<double>& n,
                               const std::vector<double>& observed,
                               const std::vector<double>& assumed) {
    double total = 0.0, mean_observed = 0.0, mean_assumed = 0.0, product = 0.0, square = 0.0;
    for (std::size_t b = 0; b < n.size(); ++b) {
        total += n[b];
        mean_observed += n[b] * observed[b];
        mean_assumed += n[b] * assumed[b];
        product += n[b] * observed[b] * assumed[b];
        square += n[b] * assumed[b] * assumed[b];
    }
    const double across = product - mean_observed * mean_assumed / total;
    const double spread = square - mean_assumed * mean_assumed / total;
    return {across / spread, product / square};
}

}  // namespace deviascope
