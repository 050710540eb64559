// SPDX-License-Identifier: GPL-2.0-or-later
// Weights of populations drawn in memory.
#pragma once

#include <algorithm>
#include <cmath>
#include <numeric>
#include <vector>

#include "weight_cases.h"
#include "weights/sky_experiment.h"
#include "weights/weights_from_tally.h"

namespace deviascope::test {

inline std::vector<std::size_t> all_bins(const SurveyInput& survey) {
    std::vector<std::size_t> bins(survey.bins.size());
    std::iota(bins.begin(), bins.end(), std::size_t{0});
    return bins;
}

/// Draws n sources of a case and hands them on in batches.
/// @param stream  its own for each catalogue
template <class Use>
void draw_sources(
    const WeightCase& population, const Boxes& boxes, std::int64_t n, Stream& stream, Use use) {
    constexpr std::int64_t most = 65536;
    for (std::int64_t first = 0; first < n; first += most) {
        const auto rows = static_cast<std::size_t>(std::min(most, n - first));
        std::vector<std::vector<double>> value(boxes.dimension.size(),
                                               std::vector<double>(rows));
        for (std::size_t row = 0; row < rows; ++row) {
            const std::vector<double> drawn = population.draw(stream);
            for (std::size_t d = 0; d < value.size(); ++d) {
                const auto at =
                    std::ranges::find(population.properties, boxes.dimension[d].property);
                value[d][row] =
                    drawn[static_cast<std::size_t>(at - population.properties.begin())];
            }
        }
        SourceBatch batch;
        batch.first_source = first;
        batch.kept.assign(rows, 1);
        batch.value.assign(value.begin(), value.end());
        use(batch);
    }
}

/// What was measured of one catalogue.
struct CatalogueWeights {
    std::vector<double> mean, sd, in_bin;
    Eigen::MatrixXd covariance;
    std::vector<EdgePlan> plans;
    std::vector<double> pulls(const std::vector<double>& expected) const {
        std::vector<double> out;
        for (std::size_t b = 0; b < mean.size(); ++b)
            out.push_back((mean[b] - expected[b]) / sd[b]);
        return out;
    }
};

/// Weights of one catalogue of n sources with 200 bootstrap replicates.
/// @param catalogue  number of the catalogue: another one, other sources
inline CatalogueWeights weights_of_catalogue(const WeightCase& population,
                                             std::int64_t n,
                                             std::uint64_t seed,
                                             std::uint64_t number,
                                             std::uint64_t catalogue,
                                             int threads = 1) {
    const Boxes boxes(population.survey, all_bins(population.survey));
    TallyOptions options;
    options.seed = seed + catalogue;
    options.survey = number;
    options.replicates = 200;
    options.threads = threads;
    CrossingTally tally(boxes, options);
    Stream stream(seed, Purpose::test, number, catalogue, 0);
    draw_sources(population, boxes, n, stream, [&](const SourceBatch& b) { tally.add(b); });
    const WeightEstimator estimator(boxes, tally, 1.0 + population.alpha);
    const auto n_replicates = static_cast<Eigen::Index>(tally.n_replicates());
    const auto n_boxes = static_cast<Eigen::Index>(boxes.box.size());
    Eigen::MatrixXd replicate(n_replicates, n_boxes);
    CatalogueWeights out;
    out.mean = estimator.weights(0, WindowWidth::chosen);
    for (std::size_t b = 0; b < boxes.box.size(); ++b) out.in_bin.push_back(tally.in_box(b, 0));
    for (Eigen::Index r = 0; r < n_replicates; ++r) {
        const auto found =
            estimator.weights(static_cast<std::size_t>(r) + 1, WindowWidth::chosen);
        for (Eigen::Index b = 0; b < n_boxes; ++b)
            replicate(r, b) = found[static_cast<std::size_t>(b)];
    }
    const Eigen::MatrixXd centred = replicate.rowwise() - replicate.colwise().mean();
    out.covariance = centred.transpose() * centred / static_cast<double>(n_replicates - 1);
    for (Eigen::Index b = 0; b < n_boxes; ++b)
        out.sd.push_back(std::sqrt(out.covariance(b, b)));
    for (std::size_t e = 0; e < boxes.edge.size(); ++e) out.plans.push_back(estimator.plan(e));
    return out;
}

/// Mean and spread of numbers.
struct Spread {
    double n = 0.0, sum = 0.0, square = 0.0;
    void add(double x) {
        n += 1.0;
        sum += x;
        square += x * x;
    }
    void add(const Spread& other) {
        n += other.n;
        sum += other.sum;
        square += other.square;
    }
    double mean() const { return sum / n; }
    double sd() const { return std::sqrt((square - sum * sum / n) / (n - 1.0)); }
};

}  // namespace deviascope::test
