// SPDX-License-Identifier: GPL-2.0-or-later
// Measured weights against populations whose weights are known: the closed forms and integrals
// of tests/support/weight_cases.h (Ellis & Baldwin 1984, MNRAS 206, 377, for the power law; the
// others follow from special relativity and were evaluated outside this program).
#include <catch2/catch.hpp>
#include <cmath>

#include "deviascope/core/parallel.h"
#include "weight_measurement.h"

using namespace deviascope;
using namespace deviascope::test;

namespace {

std::vector<WeightCase> worked_cases() {
    return {power_law_case(0.8),
            curved_flux_case(0.15),
            redshift_case(0.4),
            magnitude_case(1.0),
            magnitude_case(0.6),
            size_case(),
            curved_magnitude_case(),
            box_case()};
}

/// Pulls of each bin of a case, over catalogues.
std::vector<Spread> pulls_of(const WeightCase& population,
                             std::uint64_t number,
                             std::int64_t n_sources,
                             std::size_t n_catalogues,
                             std::uint64_t seed) {
    std::vector<std::vector<double>> pulls(n_catalogues);
    parallel_for(n_catalogues, default_threads(), [&](std::size_t i) {
        pulls[i] = weights_of_catalogue(population, n_sources, seed, number, i)
                       .pulls(population.expected);
    });
    std::vector<Spread> spread(population.expected.size());
    for (const auto& of_catalogue : pulls)
        for (std::size_t b = 0; b < spread.size(); ++b) spread[b].add(of_catalogue[b]);
    return spread;
}

void check_pulls(std::int64_t n_sources,
                 std::size_t n_catalogues,
                 std::uint64_t seed,
                 double pooled_tolerance,
                 double case_tolerance) {
    Spread pooled;
    const auto cases = worked_cases();
    for (std::size_t c = 0; c < cases.size(); ++c) {
        for (const Spread& bin : pulls_of(cases[c], c, n_sources, n_catalogues, seed)) {
            INFO(cases[c].name << ": mean " << bin.mean() << ", spread " << bin.sd());
            CHECK(std::abs(bin.sd() - 1.0) < case_tolerance);
            pooled.add(bin);
        }
    }
    INFO("pooled: mean " << pooled.mean() << ", spread " << pooled.sd());
    CHECK(std::abs(pooled.sd() - 1.0) < pooled_tolerance);
    CHECK(std::abs(pooled.mean()) < 3.0 / std::sqrt(pooled.n));
}

}  // namespace

// Bounds of three standard deviations of a spread of 8 and of 8 x 18 pulls.
TEST_CASE("pulls of measured weights are standard normal, 8 catalogues", "[weights]") {
    check_pulls(100'000, 8, 20260817, 0.18, 0.80);
}

TEST_CASE("pulls of measured weights, 100 catalogues of 10^5 sources", "[.][weights][long]") {
    check_pulls(100'000, 100, 52001, 0.05, 0.22);
}

TEST_CASE("pulls of measured weights, 100 catalogues of 10^6 sources", "[.][weights][long]") {
    check_pulls(1'000'000, 100, 52002, 0.05, 0.22);
}

TEST_CASE("weights of shells that cover all redshifts obey the sum rule", "[weights]") {
    const WeightCase shells = redshift_case(0.4);
    const CatalogueWeights found = weights_of_catalogue(shells, 300'000, 52003, 0, 0);
    // Their redshift edges telescope: sum N B = N [2 + x (1 + alpha)], 4.16 in the mean.
    double total = 0.0, sum = 0.0, variance = 0.0;
    for (std::size_t b = 0; b < found.mean.size(); ++b) {
        total += found.in_bin[b];
        sum += found.in_bin[b] * found.mean[b];
        for (std::size_t c = 0; c < found.mean.size(); ++c)
            variance +=
                found.in_bin[b] * found.in_bin[c] *
                found.covariance(static_cast<Eigen::Index>(b), static_cast<Eigen::Index>(c));
    }
    const double mean = sum / total;
    const double sd = std::sqrt(variance) / total;
    INFO("mean " << mean << " +- " << sd);
    CHECK(std::abs(mean - 4.16) < 3.0 * sd);
    // What the shells share is in the covariance: without it the error is far larger.
    double apart = 0.0;
    for (std::size_t b = 0; b < found.mean.size(); ++b)
        apart += std::pow(found.in_bin[b] * found.sd[b] / total, 2);
    CHECK(sd < 0.7 * std::sqrt(apart));
}

TEST_CASE("a catalogue that ends at its flux limit has unbiased weights and larger errors",
          "[weights]") {
    // The same populations, drawn from the limit on and from well below it.
    struct Pair {
        WeightCase deep, cut;
        std::size_t bin;
    };
    const Pair pairs[] = {{power_law_case(0.8), power_law_case(2.0), 0},
                          {curved_flux_case(0.15), curved_flux_case(0.5), 0}};
    constexpr std::size_t n_catalogues = 24;
    for (const Pair& pair : pairs) {
        std::vector<double> weight(n_catalogues), sd(n_catalogues);
        parallel_for(n_catalogues, default_threads(), [&](std::size_t i) {
            const auto found = weights_of_catalogue(pair.cut, 200'000, 52004, 0, i);
            weight[i] = found.mean[pair.bin];
            sd[i] = found.sd[pair.bin];
            if (found.plans[0].method != EdgeMethod::one_sided) weight[i] = std::nan("");
        });
        Spread weights, errors;
        for (std::size_t i = 0; i < n_catalogues; ++i) {
            weights.add(weight[i]);
            errors.add(sd[i]);
        }
        const double expected = pair.cut.expected[pair.bin];
        INFO(pair.cut.name << ": mean " << weights.mean() << ", spread " << weights.sd()
                           << ", errors " << errors.mean());
        CHECK(std::abs(weights.mean() / expected - 1.0) < 0.01);
        CHECK(weights.sd() / errors.mean() < 1.45);  // three deviations of a spread of 24
        CHECK(weights.sd() / errors.mean() > 0.55);
        const auto deep = weights_of_catalogue(pair.deep, 800'000, 52005, 0, 0);
        // As many sources in the bin, or fewer; and yet a smaller error.
        CHECK(errors.mean() * std::sqrt(200'000.0) >
              1.2 * deep.sd[pair.bin] * std::sqrt(deep.in_bin[pair.bin]));
    }
}

TEST_CASE("the full-sky experiment agrees with the measured weights", "[weights]") {
    Spread pooled;
    const auto cases = worked_cases();
    for (std::size_t c = 0; c < cases.size(); ++c) {
        constexpr std::size_t n_catalogues = 4;
        std::vector<std::vector<double>> pulls(n_catalogues);
        parallel_for(n_catalogues, default_threads(), [&](std::size_t i) {
            const Boxes boxes(cases[c].survey, all_bins(cases[c].survey));
            WeighOptions options;
            options.seed = 52006 + i;
            options.survey = c;
            options.experiment_speed = 0.05;
            CrossingTally tally(boxes, {options.seed, c, 0, 1, false});
            SkyExperimentTally experiment(boxes, options, 1.0 + cases[c].alpha);
            Stream stream(52006, Purpose::test, c, i, 0);
            draw_sources(cases[c], boxes, 200'000, stream, [&](const SourceBatch& batch) {
                tally.add(batch);
                experiment.add(batch);
            });
            const WeightEstimator estimator(boxes, tally, 1.0 + cases[c].alpha);
            for (std::size_t b = 0; b < boxes.box.size(); ++b) {
                const SkyExperiment result = experiment.result(b, estimator, tally, 0.0);
                pulls[i].push_back(result.possible ? result.pull() : std::nan(""));
            }
        });
        for (const auto& of_catalogue : pulls)
            for (const double pull : of_catalogue) {
                INFO(cases[c].name);
                CHECK(std::abs(pull) < 4.5);
                pooled.add(pull);
            }
    }
    // Bins of one catalogue share its positions, so that pulls are correlated: a loose bound.
    INFO("mean " << pooled.mean() << ", spread " << pooled.sd());
    CHECK(std::abs(pooled.mean()) < 0.5);
    CHECK(pooled.sd() < 1.35);
    CHECK(pooled.sd() > 0.7);
}

TEST_CASE("measured weights have the same bits on any number of threads", "[weights]") {
    const auto one = weights_of_catalogue(box_case(), 150'000, 52007, 0, 0, 1);
    const auto three = weights_of_catalogue(box_case(), 150'000, 52007, 0, 0, 3);
    CHECK(one.mean == three.mean);
    CHECK(one.covariance == three.covariance);
}
