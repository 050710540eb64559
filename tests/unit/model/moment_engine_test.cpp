// SPDX-License-Identifier: GPL-2.0-or-later
#include <catch2/catch.hpp>
#include <cmath>

#include "deviascope/model/moment_engine.h"
#include "exact_posterior.h"
#include "model/bin_expansion.h"
#include "synthetic_counts.h"

using namespace deviascope;

namespace {

std::vector<synthetic::Survey> surveys() {
    const auto cap = [](const Direction& n) {
        return n.z() > -0.3 ? 1.0 - 0.5 * n.x() * n.x() : 0.0;
    };
    return {{"dunlin",
             {{"faint", 1e5, 3.0},
              {"middle", 3e4, 13.6, 0.0, 0.7},
              {"bright", 1e4, -2.0, 0.0, 1.4, 1.3}},
             {0.01, 0.0, -0.01},
             cap},
            {"lantern", {{"one", 1e6, 5.0}}}};
}

Counts make_counts() {
    return synthetic::make_counts(8, {0.002, 0.001, -0.003}, surveys(), 61);
}

ModelOptions make_model(bool sampled = false) {
    ModelOptions model = synthetic::make_model(
        surveys(), {"wide", UniformVectorPrior{1.0}}, {"wide", UniformVectorPrior{1.0}});
    model.monopole = {0.0, 0.0, sampled};
    return model;
}

/// A row of parameters; monopoles at their expectation.
Eigen::VectorXd row_at(const Counts& counts,
                       const ParameterSpace& space,
                       const Eigen::VectorXd& vectors) {
    Eigen::VectorXd coordinates(space.n_coordinates());
    coordinates.head(9) = vectors;
    Eigen::VectorXd row(space.n_parameters());
    if (space.options().monopole.sampled)
        coordinates.tail(4).setConstant(
            std::log(static_cast<double>(counts.surveys[0].bins[0].total())));
    space.to_parameters(coordinates, row);
    return row;
}

Eigen::VectorXd small_vectors() {
    Eigen::VectorXd vectors(9);
    vectors << 0.003, -0.001, 0.002, 0.02, 0.01, -0.03, -0.01, 0.004, 0.01;
    return vectors;
}

}  // namespace

TEST_CASE("sources beyond a degree's bound ask for the next degree", "[model]") {
    const Counts counts = make_counts();
    const ParameterSpace space(counts, make_model());
    int last = 0;
    for (const double tolerance : {10.0, 1e-1, 1e-3, 1e-5, 1e-7}) {
        const MomentEngine engine(counts, space, tolerance);
        const MomentEngine::Degrees degrees =
            engine.degrees_for(row_at(counts, space, small_vectors()));
        CHECK(degrees.are_enough());
        CHECK(degrees.intrinsic > last);
        last = degrees.intrinsic;
    }
}

TEST_CASE("the isotropic sky needs the lowest degree and gives exactly 0", "[model]") {
    const Counts counts = make_counts();
    const ParameterSpace space(counts, make_model());
    const MomentEngine engine(counts, space, 1e-6);
    const Eigen::VectorXd row = row_at(counts, space, Eigen::VectorXd::Zero(9));
    const std::vector<MomentEngine::Degrees> degrees = {engine.degrees_for(row)};
    CHECK(degrees[0].velocity == 1);
    CHECK(degrees[0].intrinsic == 1);
    Eigen::MatrixXd balance(4, 1), log_expected(4, 1);
    const std::vector<Eigen::Index> walkers = {0};
    engine.sums(row, walkers, degrees, balance, log_expected);
    CHECK((balance.array() == 0.0).all());
    CHECK((log_expected.array() == 0.0).all());
}

TEST_CASE("no degree is enough near the walls, for large weights and for large dipoles",
          "[model]") {
    const Counts counts = make_counts();
    const ParameterSpace space(counts, make_model());
    const MomentEngine engine(counts, space, 1e-6);
    Eigen::VectorXd vectors = Eigen::VectorXd::Zero(9);
    vectors[0] = 0.08;  // 13.6 * 0.08 > 1: expected counts not bounded away from 0
    CHECK_FALSE(engine.degrees_for(row_at(counts, space, vectors)).are_enough());
    vectors.setZero();
    vectors[7] = 0.4;
    CHECK_FALSE(engine.degrees_for(row_at(counts, space, vectors)).are_enough());
    vectors[7] = 0.999999;
    CHECK_FALSE(engine.degrees_for(row_at(counts, space, vectors)).are_enough());
}

TEST_CASE("a large expected excess is still exact", "[model]") {
    // x beyond 0.29, where ln(1+x) - x needs the general form.
    std::vector<synthetic::Survey> one = {
        {"dunlin", {{"all", 200, 13.6}}, {0, 0, 0}, [](const Direction& n) {
             return n.z() > 0.8 ? 1.0 : 0.0;
         }}};
    const Counts counts = synthetic::make_counts(16, {0, 0, 0}, one, 62);
    const VectorPrior wide("wide", UniformVectorPrior{1.0});
    const ParameterSpace space(counts, synthetic::make_model(one, wide, wide));
    Eigen::VectorXd coordinates = Eigen::VectorXd::Zero(6);
    coordinates[2] = 0.03;
    Eigen::VectorXd row(space.n_parameters());
    space.to_parameters(coordinates, row);
    const MomentEngine engine(counts, space, 1e-4);
    const std::vector<MomentEngine::Degrees> degrees = {engine.degrees_for(row)};
    REQUIRE(degrees[0].are_enough());
    Eigen::MatrixXd balance(1, 1), log_expected(1, 1);
    const std::vector<Eigen::Index> walkers = {0};
    engine.sums(row, walkers, degrees, balance, log_expected);
    CHECK(log_expected(0, 0) > 0.3);
    const exact::Real truth = exact::log_likelihood(counts, space, row);
    CHECK(std::abs(balance(0, 0) - static_cast<double>(truth)) < 1e-4);
}

TEST_CASE("walkers give the same bits alone, in pairs and among others", "[model]") {
    const Counts counts = make_counts();
    const ParameterSpace space(counts, make_model());
    const MomentEngine engine(counts, space, 1e-6);
    constexpr Eigen::Index n = 21;
    Eigen::MatrixXd rows(space.n_parameters(), n);
    std::vector<MomentEngine::Degrees> degrees;
    std::vector<Eigen::Index> all;
    for (Eigen::Index w = 0; w < n; ++w) {
        rows.col(w) =
            row_at(counts, space, std::pow(0.8, static_cast<double>(w)) * small_vectors());
        degrees.push_back(engine.degrees_for(rows.col(w)));
        all.push_back(w);
    }
    Eigen::MatrixXd balance(4, n), log_expected(4, n), other(4, n), other_expected(4, n);
    engine.sums(rows, all, degrees, balance, log_expected);
    for (std::size_t size : {1U, 2U, 5U}) {
        for (std::size_t first = 0; first < all.size(); first += size) {
            const std::size_t some = std::min(size, all.size() - first);
            engine.sums(rows,
                        std::span(all).subspan(first, some),
                        std::span(degrees).subspan(first, some),
                        other,
                        other_expected);
        }
        CHECK((other.array() == balance.array()).all());
        CHECK((other_expected.array() == log_expected.array()).all());
    }
}

TEST_CASE("derivatives from moments equal those from pixels", "[model]") {
    const Counts counts = make_counts();
    const ParameterSpace space(counts, make_model());
    const MomentEngine engine(counts, space, 1e-6);
    const Eigen::VectorXd row = row_at(counts, space, small_vectors());
    for (std::size_t t = 0; t < space.terms().size(); ++t) {
        const BinExpansion fast = engine.expansion(t, row);
        const BinExpansion exact = pixel_expansion(counts, space.terms()[t], row);
        const double n = static_cast<double>(
            counts.surveys[space.terms()[t].survey].bins[space.terms()[t].bin].total());
        CHECK(fast.counted == Approx(exact.counted).epsilon(1e-12).margin(1e-12 * n));
        CHECK((fast.counted_gradient - exact.counted_gradient).norm() < 1e-8 * n);
        CHECK((fast.counted_hessian - exact.counted_hessian).norm() < 1e-6 * n);
        CHECK(fast.log_expected == Approx(exact.log_expected).margin(1e-12));
        CHECK((fast.log_expected_gradient - exact.log_expected_gradient).norm() < 1e-8);
        CHECK((fast.log_expected_hessian - exact.log_expected_hessian).norm() < 1e-6);
    }
}

namespace {

using Offsets = std::array<double, 8>;

/// A function of eight variables at 0: 80-bit central differences, extrapolated from steps h
/// and 2h to an error of order h^4 (Richardson 1911).
template <class Function>
struct Differences {
    Function value;
    double step;

    exact::Real slope(std::size_t i) const {
        return extrapolated(slope_with(i, 1), slope_with(i, 2));
    }
    exact::Real curve(std::size_t i, std::size_t j) const {
        return extrapolated(curve_with(i, j, 1), curve_with(i, j, 2));
    }

  private:
    static exact::Real extrapolated(exact::Real fine, exact::Real coarse) {
        return (4 * fine - coarse) / 3;
    }
    exact::Real at(std::size_t i, double di, std::size_t j, double dj) const {
        Offsets offsets{};
        offsets[i] += di;
        offsets[j] += dj;
        return value(offsets);
    }
    exact::Real slope_with(std::size_t i, int multiple) const {
        const double h = multiple * step;
        return (at(i, h, i, 0) - at(i, -h, i, 0)) / (2 * exact::Real(h));
    }
    exact::Real curve_with(std::size_t i, std::size_t j, int multiple) const {
        const double h = multiple * step;
        return (at(i, h, j, h) - at(i, h, j, -h) - at(i, -h, j, h) + at(i, -h, j, -h)) /
               (4 * exact::Real(h) * exact::Real(h));
    }
};

}  // namespace

TEST_CASE("first and second derivatives equal 80-bit central differences", "[model]") {
    const bool sampled = GENERATE(false, true);
    const Counts counts = make_counts();
    ModelOptions model = make_model(sampled);
    if (!sampled) model.monopole = {2.0, 30.0, false};
    const ParameterSpace space(counts, model);
    const std::vector<BinTotals> totals = totals_of(counts, space);
    const MomentEngine engine(counts, space, 1e-6);
    const Eigen::VectorXd centre = row_at(counts, space, small_vectors());
    for (std::size_t t = 0; t < space.terms().size(); ++t) {
        const BinTerm& term = space.terms()[t];
        const Eigen::Index d = term.intrinsic;
        const std::array<Eigen::Index, 8> place = {
            0, 1, 2, d, d + 1, d + 2, term.weight, term.monopole};
        // In the last variable steps are steps of ln M.
        const auto value = [&](const Offsets& offsets) {
            Eigen::VectorXd row = centre;
            for (std::size_t i = 0; i < 7; ++i) row[place[i]] += offsets[i];
            if (sampled) row[place[7]] *= std::exp(offsets[7]);
            return exact::log_likelihood_of_term(counts, space, term, row);
        };
        const Differences<decltype(value)> differences{value, std::ldexp(1.0, -12)};
        const BinLogLikelihood found = log_likelihood_of(
            engine.expansion(t, centre), totals[t], model.monopole, centre[term.monopole]);
        const double weight = std::max(1.0, std::abs(centre[term.weight]));
        const double scale =
            weight * weight *
            static_cast<double>(counts.surveys[term.survey].bins[term.bin].total());
        for (std::size_t i = 0; i < (sampled ? 8U : 7U); ++i) {
            const auto row = static_cast<int>(i);
            INFO("term " << t << ", variable " << i);
            CHECK(std::abs(found.gradient[row] - static_cast<double>(differences.slope(i))) <
                  1e-8 * scale);
            for (std::size_t j = 0; j <= i; ++j) {
                const auto column = static_cast<int>(j);
                INFO("and " << j);
                CHECK(std::abs(found.hessian(row, column) -
                               static_cast<double>(differences.curve(i, j))) < 1e-6 * scale);
                CHECK(std::abs(found.hessian(row, column) - found.hessian(column, row)) <
                      1e-12 * scale);
            }
        }
    }
}
