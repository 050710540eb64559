// SPDX-License-Identifier: GPL-2.0-or-later
#include <boost/math/distributions/chi_squared.hpp>
#include <catch2/catch.hpp>
#include <cmath>
#include <numbers>

#include "deviascope/core/physical_constants.h"
#include "deviascope/summary/line_density.h"
#include "deviascope/summary/plane_density.h"
#include "drawn_values.h"

using namespace deviascope;

namespace {

constexpr std::size_t n_draws = 20000;

template <class Draw>
std::vector<double> drawn(std::uint64_t number, const Draw& draw) {
    return test::drawn_values(20260817, number, n_draws, draw);
}

double largest_error(const LineDensity& density, double (*truth)(double)) {
    double error = 0.0;
    for (std::size_t node = 0; node < density.place.size(); ++node)
        error = std::max(error, std::abs(density.density[node] - truth(density.place[node])));
    return error;
}

}  // namespace

// Densities of the normal, half-normal and Gamma(2) distributions as any textbook has them.
// Bounds: bias h^2/2 |f''| (at most .016, .016, .010 at these sizes) and four standard errors
// sqrt(f / (2 sqrt(pi) n h)) of a Gaussian kernel (Silverman 1986, section 3.3; from memory).
TEST_CASE("line densities follow known densities, to the very end of their range",
          "[summary]") {
    const auto plain = line_density(drawn(1, [](Stream& s) { return normal(s); }), n_draws);
    CHECK(largest_error(plain, [](double x) {
              return std::exp(-0.5 * x * x) / std::sqrt(2.0 * std::numbers::pi);
          }) < 0.035);
    const auto half = line_density(
        drawn(2, [](Stream& s) { return std::abs(normal(s)); }), n_draws, {0.0, {}});
    CHECK(half.place.front() == 0.0);
    CHECK(largest_error(half, [](double x) {
              return std::exp(-0.5 * x * x) * std::sqrt(2.0 / std::numbers::pi);
          }) < 0.07);
    const auto gamma = line_density(drawn(3,
                                          [](Stream& s) {
                                              const double a = uniform(s);
                                              const double b = uniform(s);
                                              return -std::log1p(-a) - std::log1p(-b);
                                          }),
                                    n_draws,
                                    {0.0, {}});
    // At an end where the density vanishes the form keeps f0 exp(f_lin / f0 - 1) above zero.
    // Gamma(2): f = x - x^2 + …, a_0 = a_2 = 1/2, |a_1| = 0.399, a_3 = 0.798: to second order
    // f0 = 0.80 h - h^2, f_lin = 0.75 h^2. Elsewhere the bound is as above.
    const double h = 0.19;  // 1.06 x 1.28 (the IQR of Gamma(2) over 1.349) x 20000^-0.2
    const double f0 = 0.80 * h - h * h;
    CHECK(gamma.at(0.0) == Approx(f0 * std::exp(0.75 * h * h / f0 - 1.0)).margin(0.01));
    LineDensity beyond = gamma;
    std::erase_if(beyond.place, [&](double x) { return x < 2.0 * h; });
    beyond.density.erase(beyond.density.begin(),
                         beyond.density.end() - std::ssize(beyond.place));
    CHECK(largest_error(beyond, [](double x) { return x * std::exp(-x); }) < 0.02);
}

TEST_CASE("line densities integrate to one and are never negative", "[summary]") {
    const std::vector<double> values = drawn(4, [](Stream& s) { return uniform(s); });
    const LineDensity density = line_density(values, n_draws, {0.0, 1.0});
    double sum = 0.0;
    for (std::size_t node = 1; node < density.place.size(); ++node) {
        sum += 0.5 * (density.density[node] + density.density[node - 1]) *
               (density.place[node] - density.place[node - 1]);
        CHECK(density.density[node] >= 0.0);
    }
    CHECK(sum == Approx(1.0).epsilon(1e-9));
    CHECK(density.at(-0.1) == 0.0);
    // Uniform on [0, 1], ends included: no droop at either end.
    CHECK(density.at(0.0) == Approx(1.0).margin(0.12));
    CHECK(density.at(1.0) == Approx(1.0).margin(0.12));
    CHECK(line_density(std::vector<double>(10, 2.0), 10).place.empty());
    CHECK(line_density(std::vector<double>{}, 10).peak() == 0.0);
}

// Mass of a normal pair inside the ellipse of size c is 1 - exp(-c/2): known in closed form, so
// the true content of a drawn region is counted with fresh draws.
TEST_CASE("regions of a pair hold what they say", "[summary]") {
    for (const double correlation : {0.0, 0.5, -0.95}) {
        const auto pair = [&](std::uint64_t number) {
            const auto a = drawn(number, [](Stream& s) { return normal(s); });
            auto b = drawn(number + 1, [](Stream& s) { return normal(s); });
            for (std::size_t at = 0; at < n_draws; ++at)
                b[at] =
                    correlation * a[at] + std::sqrt(1.0 - correlation * correlation) * b[at];
            return std::pair{a, b};
        };
        const auto [x, y] = pair(10);
        const auto [fresh_x, fresh_y] = pair(20);
        const PlaneDensity density(x, y, n_draws);
        REQUIRE(density.is_defined());
        for (const double probability : {level68, level95}) {
            double inside = 0.0;
            for (std::size_t at = 0; at < n_draws; ++at)
                inside += density.at(fresh_x[at], fresh_y[at]) > density.level(probability);
            INFO(correlation << " " << probability);
            CHECK(inside / n_draws == Approx(probability).margin(0.01));
        }
    }
}

TEST_CASE("regions of a pair end at the ends of its range", "[summary]") {
    const auto x = drawn(30, [](Stream& s) { return std::abs(normal(s)); });
    const auto y = drawn(31, [](Stream& s) { return normal(s); });
    const PlaneDensity density(x, y, n_draws, {Support{0.0, {}}, Support{}});
    const auto fresh_x = drawn(32, [](Stream& s) { return std::abs(normal(s)); });
    const auto fresh_y = drawn(33, [](Stream& s) { return normal(s); });
    for (const double probability : {level68, level95}) {
        double inside = 0.0;
        for (std::size_t at = 0; at < n_draws; ++at)
            inside += density.at(fresh_x[at], fresh_y[at]) > density.level(probability);
        CHECK(inside / n_draws == Approx(probability).margin(0.01));
    }
    CHECK(density.pair_at(0.0, 0.0).x() == Approx(0.0).margin(1e-12));
    CHECK(density.at(0.0, 0.0) == Approx(2.0 * density.at(1.1774, 0.0)).epsilon(0.12));
}

TEST_CASE("pairs on a line have no density", "[summary]") {
    const auto x = drawn(40, [](Stream& s) { return normal(s); });
    CHECK_FALSE(PlaneDensity(x, x, n_draws).is_defined());
    CHECK_FALSE(PlaneDensity(x, std::vector<double>(n_draws, 1.0), n_draws).is_defined());
}
