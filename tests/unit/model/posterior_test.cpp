// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/model/posterior.h"

#include <Eigen/LU>
#include <boost/math/distributions/gamma.hpp>
#include <catch2/catch.hpp>
#include <cmath>
#include <cstring>
#include <limits>
#include <numeric>

#include "deviascope/core/error.h"
#include "deviascope/model/information.h"
#include "exact_posterior.h"
#include "kolmogorov.h"
#include "synthetic_counts.h"

using namespace deviascope;

namespace {

constexpr double minus_infinity = -std::numeric_limits<double>::infinity();

double band_15(const Direction& n) {
    return std::abs(n.z()) > 0.26 ? 1.0 - 0.3 * n.x() * n.x() : 0.0;
}
double south(const Direction& n) {
    return n.z() < 0.5 ? 1.0 : 0.0;
}

/// Two surveys with unlike footprints, graded exposure, bias ratio, dispersion, a negative
/// weight and one that is not sampled.
std::vector<synthetic::Survey> two_surveys() {
    return {
        {"dunlin",
         {{"faint", 40000, 2.5, 0.1}, {"bright", 20000, 6.0, 0.2, 1.4, 1.3}},
         {0.01, -0.02, 0.01},
         band_15},
        {"lantern", {{"near", 30000, 9.0, 0.3}, {"far", 30000, -1.5, 0.0}}, {0, 0, 0}, south}};
}

struct Case {
    explicit Case(int nside = 8)
        : counts(synthetic::make_counts(nside, {0.001, 0.002, -0.001}, surveys, 61)) {}
    std::vector<synthetic::Survey> surveys = two_surveys();
    Counts counts;
    ModelOptions options = synthetic::make_model(
        surveys, {"free", UniformAmplitudePrior{0.5}}, {"modest", UniformVectorPrior{0.6}});
};

/// Starting points, some of them stretched towards and over the walls.
Eigen::MatrixXd walkers_of(const Posterior& posterior, Eigen::Index n, std::uint64_t seed) {
    Eigen::MatrixXd coordinates(posterior.n_coordinates(), n);
    for (Eigen::Index w = 0; w < n; ++w) {
        Stream stream(seed, Purpose::test, 0, static_cast<std::uint64_t>(w), 0);
        posterior.draw_start(stream, coordinates.col(w));
        if (w % 3 == 1) coordinates.col(w).head(6) *= w % 2 == 0 ? 10.0 : 2.0;
    }
    return coordinates;
}

struct Densities {
    Eigen::VectorXd posterior, likelihood;
};

Densities densities(const Posterior& target, const Eigen::Ref<const Eigen::MatrixXd>& walkers) {
    Densities found{Eigen::VectorXd(walkers.cols()), Eigen::VectorXd(walkers.cols())};
    target.log_density(walkers, found.posterior, found.likelihood);
    return found;
}

bool same_bits(const Eigen::VectorXd& a, const Eigen::VectorXd& b) {
    return a.size() == b.size() &&
           std::memcmp(
               a.data(), b.data(), sizeof(double) * static_cast<std::size_t>(a.size())) == 0;
}

}  // namespace

TEST_CASE("a walker's density is the same bits alone, in a pair and in any batch", "[model]") {
    for (const bool sampled : {false, true}) {
        Case job;
        job.options.monopole.sampled = sampled;
        const Posterior target(job.counts, job.options);
        const Eigen::MatrixXd walkers = walkers_of(target, 23, 62);
        const Densities all = densities(target, walkers);
        CHECK((all.posterior.array() == minus_infinity).any());
        CHECK(std::isfinite(all.posterior[0]));
        for (Eigen::Index first = 0; first < walkers.cols(); ++first)
            for (const Eigen::Index n : {1, 2, 7}) {
                if (first + n > walkers.cols()) continue;
                const Densities some = densities(target, walkers.middleCols(first, n));
                REQUIRE(same_bits(some.posterior, all.posterior.segment(first, n)));
                REQUIRE(same_bits(some.likelihood, all.likelihood.segment(first, n)));
            }
        // Rows that begin elsewhere in memory, and company of another kind.
        Eigen::MatrixXd odd(walkers.rows() + 1, walkers.cols());
        odd.bottomRows(walkers.rows()) = walkers.rowwise().reverse();
        const Eigen::MatrixXd copied = odd.bottomRows(walkers.rows());
        REQUIRE(same_bits(densities(target, odd.bottomRows(walkers.rows())).posterior.reverse(),
                          all.posterior));
        REQUIRE(same_bits(densities(target, copied).posterior.reverse(), all.posterior));
    }
}

TEST_CASE("the posterior agrees with an 80-bit sum over pixels", "[model]") {
    // Truth: the definition of the README, summed in long double. The moment engine may be off
    // by its tolerance besides.
    const auto [engine, tolerance] = GENERATE(std::pair(Engine::pixel, 0.0),
                                              std::pair(Engine::automatic, 1e-6),
                                              std::pair(Engine::moment, 1e-8));
    Case job;
    job.options.engine = {engine, tolerance};
    job.options.monopole = {2.0, 0.3, false};
    const Posterior target(job.counts, job.options);
    const Eigen::MatrixXd walkers = walkers_of(target, 30, 63);
    const Densities found = densities(target, walkers);
    Eigen::MatrixXd rows(target.space().n_parameters(), walkers.cols());
    target.to_parameters(walkers, rows);
    int n_finite = 0;
    for (Eigen::Index w = 0; w < walkers.cols(); ++w) {
        if (found.posterior[w] == minus_infinity) continue;
        ++n_finite;
        const auto truth = exact::log_likelihood(job.counts, target.space(), rows.col(w));
        CHECK(std::abs(static_cast<double>(found.likelihood[w] - truth)) <
              tolerance + 1e-9 + 1e-14 * std::abs(found.likelihood[w]));
        CHECK(found.posterior[w] - found.likelihood[w] ==
              Approx(target.space().log_prior(walkers.col(w))).margin(1e-8));
    }
    CHECK(n_finite > 20);
}

TEST_CASE("next to the walls the density is finite and right, beyond them it is -inf",
          "[model]") {
    Case job;
    job.options = synthetic::make_model(
        job.surveys, {"wide", UniformVectorPrior{1.0}}, {"wide", UniformVectorPrior{1.0}});
    const Posterior target(job.counts, job.options);
    const Eigen::Vector3d towards = Pixelisation(8).centre(0);  // straight at a pixel
    Eigen::VectorXd at(target.n_coordinates());
    for (const double beta : {0.3, 0.9, 0.999999, 1.0 - 1e-12})
        for (const double weight : {2.5, -30.0, 60.0, 400.0}) {
            at << beta * towards, 0.0, 0.7, 0.0, 0.0, 0.0, -0.9, weight, 6.0, 9.0;
            const Densities found = densities(target, at);
            Eigen::MatrixXd row(target.space().n_parameters(), 1);
            target.to_parameters(at, row);
            const double truth = static_cast<double>(
                exact::log_likelihood(job.counts, target.space(), row.col(0)));
            INFO("beta " << beta << " weight " << weight);
            // 1 - beta.n is known to 1e-16 only, so the relative error grows towards the wall.
            CHECK(found.likelihood[0] == Approx(truth).epsilon(1e-12 + 2e-16 / (1.0 - beta)));
        }
    at << 0.0, 0.0, 0.0, 0.0, 0.0, 0.8, 0.0, 0.0, 0.0, 2.5, 6.0, 9.0;  // r = 1.4
    CHECK(densities(target, at).posterior[0] == minus_infinity);
    CHECK(densities(target, at).likelihood[0] == minus_infinity);
    at[5] = 0.7;
    CHECK(std::isfinite(densities(target, at).posterior[0]));
    at[0] = 1.0;
    CHECK(densities(target, at).posterior[0] == minus_infinity);
}

TEST_CASE("integrated and sampled monopoles give one posterior", "[model]") {
    // The integral over ln M of the sampled form (trapezoidal rule, exact to rounding for a
    // smooth peak), relative to the isotropic sky, against the integrated form.
    for (const MonopolePrior prior : {MonopolePrior{0.0, 0.0}, {1.0, 0.0}, {3.0, 200.0}}) {
        std::vector<synthetic::Survey> surveys = {
            {"dunlin", {{"faint", 400, 3.0, 0.0, 1.0, 1.7}}, {0, 0, 0}, band_15}};
        const Counts counts = synthetic::make_counts(4, {0, 0, 0}, surveys, 64);
        ModelOptions options = synthetic::make_model(
            surveys, {"wide", UniformVectorPrior{1.0}}, {"wide", UniformVectorPrior{1.0}});
        options.monopole = prior;
        const Posterior integrated(counts, options);
        options.monopole.sampled = true;
        const Posterior sampled(counts, options);
        const auto log_integral = [&](const Eigen::VectorXd& vectors) {
            constexpr int n = 4000;
            Eigen::MatrixXd walkers(7, n);
            const double centre = std::log(400.0 / 10.0);
            const double step = 8.0 / n;
            for (int k = 0; k < n; ++k) {
                walkers.col(k).head(6) = vectors;
                walkers(6, k) = centre + (k - n / 2) * step;
            }
            const Eigen::VectorXd values = densities(sampled, walkers).posterior;
            const double largest = values.maxCoeff();
            return largest + std::log((values.array() - largest).exp().sum() * step);
        };
        Eigen::VectorXd vectors(6);
        vectors << 0.1, -0.2, 0.05, 0.2, 0.1, -0.3;
        const double relative = log_integral(vectors) - log_integral(Eigen::VectorXd::Zero(6));
        const Eigen::VectorXd zero = Eigen::VectorXd::Zero(6);
        const double closed = densities(integrated, vectors).posterior[0] -
                              densities(integrated, zero).posterior[0];
        INFO("shape " << prior.shape << " rate " << prior.rate);
        CHECK(relative == Approx(closed).margin(1e-9));
        CHECK(densities(integrated, zero).likelihood[0] == 0.0);
    }
}

TEST_CASE("an empty bin is refused under a shape of 0 and counted under another", "[model]") {
    std::vector<synthetic::Survey> surveys = {
        {"dunlin", {{"faint", 400, 3.0}, {"none", 0, 3.0}}}};
    const Counts counts = synthetic::make_counts(2, {0, 0, 0}, surveys, 65);
    REQUIRE(counts.surveys[0].bins[1].total() == 0);
    ModelOptions options = synthetic::make_model(
        surveys, {"free", UniformVectorPrior{0.5}}, {"none", FixedPrior{}});
    CHECK_THROWS_WITH(Posterior(counts, options), Catch::Contains("dunlin/none: no sources"));
    CHECK_THROWS_AS(Posterior(counts, options), InputError);
    options.monopole = {2.0, 5.0, false};
    const Posterior integrated(counts, options);
    Eigen::VectorXd row(integrated.space().n_parameters());
    const Eigen::Vector3d beta(0.1, 0.2, -0.1);
    integrated.space().to_parameters(beta, row);
    CHECK(densities(integrated, beta).likelihood[0] ==
          Approx(static_cast<double>(exact::log_likelihood(counts, integrated.space(), row))));
    options.monopole.sampled = true;
    const Posterior sampled(counts, options);
    Eigen::VectorXd at(5), still(5);
    at << beta, std::log(400.0 / 12.566), std::log(0.3);
    still << beta, std::log(400.0 / 12.566), -700.0;
    // Only the empty bin's -M E differs between the two points.
    const double exposed =
        static_cast<double>(exact::sums_of(counts, sampled.space().terms()[1], row).ratio) *
        4.0 * 3.14159265358979;
    CHECK(densities(sampled, still).likelihood[0] - densities(sampled, at).likelihood[0] ==
          Approx(0.3 * exposed).epsilon(1e-9));
    Stream stream(66, Purpose::test, 0, 0, 0);
    sampled.draw_start(stream, at);
    CHECK(std::isfinite(densities(sampled, at).posterior[0]));
}

TEST_CASE("counts of which no likelihood can be made are refused by name", "[model]") {
    const std::vector<synthetic::Survey> surveys = {{"dunlin", {{"faint", 400, 3.0}}}};
    const ModelOptions options = synthetic::make_model(
        surveys, {"free", UniformVectorPrior{0.5}}, {"none", FixedPrior{}});
    Counts counts = synthetic::make_counts(2, {0, 0, 0}, surveys, 65);
    SECTION("too many sources for a pixel") {
        counts.surveys[0].bins[0].count[7] = 2147483648U;
        CHECK_THROWS_WITH(Posterior(counts, options),
                          Catch::Contains("dunlin/faint: a pixel holds 2147483648 sources; at "
                                          "most 2147483647 are allowed"));
    }
    SECTION("no pixel") {
        counts.surveys[0].footprints[0] = {};
        counts.surveys[0].bins[0].count.clear();
        CHECK_THROWS_WITH(Posterior(counts, options),
                          Catch::Contains("dunlin/faint: no pixel is kept"));
    }
}

TEST_CASE("monopoles of extreme size are -inf or finite, never NaN", "[model]") {
    Case job;
    job.options.monopole.sampled = true;
    const Posterior target(job.counts, job.options);
    Eigen::MatrixXd walkers = walkers_of(target, 1, 67).replicate(1, 6);
    const Eigen::Index last = walkers.rows() - 1;
    walkers.row(last) << -800.0, -700.0, 0.0, 300.0, 700.0, 800.0;
    const Eigen::VectorXd found = densities(target, walkers).posterior;
    CHECK_FALSE(found.hasNaN());
    CHECK((found.array() < std::numeric_limits<double>::infinity()).all());
}

TEST_CASE("redrawn monopoles follow their Gamma distribution in closed form", "[model]") {
    // Gamma-Poisson conjugacy (textbook): posterior Gamma(N / phi + a, E / phi + b). Cumulative
    // distribution: boost::math.
    std::vector<synthetic::Survey> surveys = {
        {"dunlin",
         {{"faint", 40, 3.0}, {"bright", 12, 5.0, 0.0, 1.0, 2.5}},
         {0, 0, 0},
         band_15}};
    const Counts counts = synthetic::make_counts(2, {0, 0, 0}, surveys, 68);
    const Eigen::Vector3d beta(0.3, 0.0, -0.2);
    ModelOptions options =
        synthetic::make_model(surveys, {"known", FixedPrior{beta}}, {"none", FixedPrior{}});
    options.monopole = {1.5, 2.0, false};
    const Posterior target(counts, options);
    REQUIRE(target.n_coordinates() == 0);
    constexpr Eigen::Index n = 20000;
    Eigen::MatrixXd rows(target.space().n_parameters(), n);
    target.to_parameters(Eigen::MatrixXd(0, n), rows);
    std::vector<Stream> streams;
    for (std::uint64_t w = 0; w < n; ++w) streams.emplace_back(69, Purpose::test, 0, w, 0);
    target.redraw(streams, rows);
    for (const BinTerm& term : target.space().terms()) {
        const exact::BinSums bin = exact::sums_of(counts, term, rows.col(0));
        const double sources =
            static_cast<double>(counts.surveys[0].bins[term.bin].total()) / term.dispersion;
        const double shape = sources + 1.5;
        const double rate =
            static_cast<double>(bin.exposed_sky * bin.ratio) / term.dispersion + 2.0;
        const boost::math::gamma_distribution<double> gamma(shape, 1.0 / rate);
        const Eigen::VectorXd drawn = rows.row(term.monopole);
        CHECK(kolmogorov_distance(std::vector<double>(drawn.begin(), drawn.end()),
                                  [&](double m) { return boost::math::cdf(gamma, m); }) <
              1.949);
        // Five standard errors.
        CHECK(drawn.mean() ==
              Approx(shape / rate).margin(5.0 * std::sqrt(shape) / rate / std::sqrt(n)));
    }
    // Each column uses its own stream only, in the order of the bins.
    std::vector<Stream> one = {Stream(69, Purpose::test, 0, 7, 0)};
    Eigen::MatrixXd alone = rows.col(7);
    target.redraw(one, alone);
    CHECK(same_bits(alone.col(0), rows.col(7)));
}

TEST_CASE("starting points lie inside and are wider than the posterior", "[model]") {
    Case job(16);
    job.options.velocity = VectorPrior(
        "gaussian", GaussianPrior{{0.01, 0.0, 0.0}, 1e-4 * Eigen::Matrix3d::Identity()});
    const Posterior target(job.counts, job.options);
    constexpr Eigen::Index n = 4000;
    const Eigen::MatrixXd starts = [&] {
        Eigen::MatrixXd all(target.n_coordinates(), n);
        for (Eigen::Index w = 0; w < n; ++w) {
            Stream stream(70, Purpose::test, 0, static_cast<std::uint64_t>(w), 0);
            target.draw_start(stream, all.col(w));
        }
        return all;
    }();
    CHECK(densities(target, starts.leftCols(100)).posterior.allFinite());
    // Velocity: the information of counts and prior, everything else eliminated, taken by hand.
    Eigen::VectorXd row(target.space().n_parameters());
    Eigen::VectorXd zero = Eigen::VectorXd::Zero(target.n_coordinates());
    zero.tail(3) << 2.5, 6.0, 9.0;
    target.space().to_parameters(zero, row);
    Eigen::MatrixXd information = expected_information(job.counts, target.space(), row);
    information.topLeftCorner(3, 3).diagonal().array() += 1e4;
    information.block(3, 3, 6, 6).diagonal().array() += 5.0 / 0.36;
    for (const auto& [place, sd] : {std::pair{9, 0.1}, {10, 0.2}, {11, 0.3}})
        information(place, place) += 1.0 / (sd * sd);
    const Eigen::MatrixXd kept =
        eliminate(information, {0, 1, 2}, {3, 4, 5, 6, 7, 8, 9, 10, 11, 13, 14, 15, 16});
    const Eigen::Matrix3d expected = 4.0 * kept.inverse();
    const Eigen::MatrixXd deviation =
        starts.topRows(3).colwise() - Eigen::VectorXd(starts.topRows(3).rowwise().mean());
    const Eigen::Matrix3d found = deviation * deviation.transpose() / double(n - 1);
    // Standard error of a variance: sqrt(2 / n) = 2.2 %; five allowed.
    for (Eigen::Index c = 0; c < 3; ++c)
        CHECK(found(c, c) == Approx(expected(c, c)).epsilon(0.11));
}

TEST_CASE("where many dipoles lie far beyond their bounds, starting points lie next to them",
          "[model]") {
    // Each is 0.02 long and held to 0.004. Of a Gaussian of 21 coordinates hardly a draw lies
    // inside all bounds.
    std::vector<synthetic::Survey> surveys;
    for (int s = 0; s < 7; ++s)
        surveys.push_back({"survey-" + std::to_string(s),
                           {{"one", 1e7, 3.0}},
                           {0.02 * std::cos(s), 0.02 * std::sin(s), 0.0}});
    const Counts counts = synthetic::make_counts(4, {0, 0, 0}, surveys, 73);
    const Posterior target(
        counts,
        synthetic::make_model(
            surveys, {"none", FixedPrior{}}, {"short", UniformAmplitudePrior{0.004}}));
    REQUIRE(target.n_coordinates() == 21);
    REQUIRE(target.approximation());
    CHECK(target.approximation()->mean.allFinite());
    CHECK(target.approximation()->factor.allFinite());
    Eigen::MatrixXd starts(target.n_coordinates(), 100);
    Eigen::MatrixXd rows(static_cast<Eigen::Index>(target.parameters().size()), starts.cols());
    for (Eigen::Index w = 0; w < starts.cols(); ++w) {
        Stream stream(74, Purpose::test, 0, static_cast<std::uint64_t>(w), 0);
        target.draw_start(stream, starts.col(w));
    }
    CHECK(densities(target, starts).posterior.allFinite());
    target.to_parameters(starts, rows);
    for (Eigen::Index s = 0; s < 7; ++s)
        CHECK(rows.middleRows(3 + 3 * s, 3).colwise().norm().minCoeff() > 0.5 * 0.004);
}

TEST_CASE("where the counts say little, starting points still lie inside the priors",
          "[model]") {
    std::vector<synthetic::Survey> surveys = {
        {"dunlin", {{"one", 200, 3.0, 0.1}}, {0, 0, 0}, south},
        {"lantern", {{"two", 200, 3.0}}}};
    const Counts counts = synthetic::make_counts(4, {0, 0, 0}, surveys, 71);
    const std::vector<VectorPrior> priors = {
        VectorPrior("tight", UniformVectorPrior{0.002}),
        VectorPrior("amplitude", UniformAmplitudePrior{0.01}),
        VectorPrior("axis", AxisPrior{Direction(0.6, 0.0, 0.8), 0.01}),
        VectorPrior("gaussian",
                    GaussianPrior{{0.0, 0.0, 0.0}, 4.0 * Eigen::Matrix3d::Identity()})};
    for (const VectorPrior& velocity : priors)
        for (const VectorPrior& intrinsic : priors)
            for (const bool sampled : {false, true}) {
                ModelOptions options = synthetic::make_model(surveys, velocity, intrinsic);
                options.monopole.sampled = sampled;
                const Posterior target(counts, options);
                Eigen::MatrixXd starts(target.n_coordinates(), 50);
                for (Eigen::Index w = 0; w < starts.cols(); ++w) {
                    Stream stream(72, Purpose::test, 0, static_cast<std::uint64_t>(w), 0);
                    target.draw_start(stream, starts.col(w));
                }
                INFO(velocity.name() << ", " << intrinsic.name());
                CHECK(densities(target, starts).posterior.allFinite());
                CHECK((starts.col(0) - starts.col(1)).norm() > 0.0);
            }
}
