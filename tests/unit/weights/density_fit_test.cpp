// SPDX-License-Identifier: GPL-2.0-or-later
#include "weights/density_fit.h"

#include <algorithm>
#include <catch2/catch.hpp>
#include <cmath>
#include <functional>

#include "deviascope/core/random.h"
#include "weights/edge_window.h"

using namespace deviascope;

namespace {

/// Expected counts of cells where ln f is a polynomial: f integrated by 64 steps of the
/// midpoint rule.
std::vector<double> expected_counts(const std::vector<double>& boundary,
                                    const std::function<double(double)>& f) {
    std::vector<double> out;
    for (std::size_t i = 0; i + 1 < boundary.size(); ++i) {
        const double step = (boundary[i + 1] - boundary[i]) / 64.0;
        double sum = 0.0;
        for (int k = 0; k < 64; ++k) sum += f(boundary[i] + (k + 0.5) * step);
        out.push_back(sum * step);
    }
    return out;
}

}  // namespace

TEST_CASE("a density whose logarithm is a parabola is found exactly", "[weights]") {
    const EdgeCells cells(1.4);
    const auto f = [](double y) { return std::exp(7.0 - 1.3 * y + 0.4 * y * y); };
    for (const EdgeWindow window : {EdgeWindow{60, 60}, {0, 70}, {80, 0}, {10, 50}}) {
        const auto boundary = boundaries_of(cells, window);
        const auto fit = DensityFit(boundary, 2).fit(expected_counts(boundary, f));
        REQUIRE(fit);
        CHECK(fit->at_edge() == Approx(std::exp(7.0)).epsilon(2e-5));
        CHECK(fit->at(0.3) == Approx(f(0.3)).epsilon(2e-4));
    }
}

TEST_CASE("the error of a fitted density is that of many catalogues", "[weights]") {
    // Uniform sources on both sides: var ln f(0) = 9/4 / n in theory for degree 2, 9 / n on one
    // side (the classical factors of local quadratic regression with uniform weights).
    const EdgeCells cells(1.0);
    struct Kind {
        EdgeWindow window;
        double factor;
    };
    for (const Kind& kind : {Kind{{96, 96}, 2.25}, Kind{{0, 96}, 9.0}}) {
        const auto boundary = boundaries_of(cells, kind.window);
        const DensityFit fit(boundary, 2);
        const double width = boundary.back() - boundary.front();
        constexpr int n_sources = 4000, n_catalogues = 200;
        double sum = 0.0, square = 0.0;
        for (int catalogue = 0; catalogue < n_catalogues; ++catalogue) {
            Stream stream(52010, Purpose::test, static_cast<std::uint64_t>(catalogue), 0, 0);
            std::vector<double> count(boundary.size() - 1);
            for (int i = 0; i < n_sources; ++i) {
                const double y = boundary.front() + width * uniform(stream);
                const auto above = std::upper_bound(boundary.begin(), boundary.end(), y);
                count[static_cast<std::size_t>(above - boundary.begin()) - 1] += 1.0;
            }
            const auto found = fit.fit(count);
            REQUIRE(found);
            CHECK(found->variance * n_sources == Approx(kind.factor).epsilon(0.15));
            const double shift = std::log(found->at_edge() * width / n_sources);
            sum += shift;
            square += shift * shift;
        }
        // A total of n sources, not a Poisson number of them: the variance is lower by 1 / n.
        const double variance = square / n_catalogues - std::pow(sum / n_catalogues, 2);
        CHECK(variance * n_sources == Approx(kind.factor - 1.0).epsilon(0.35));
    }
}

TEST_CASE("counts that determine no density give none", "[weights]") {
    const EdgeCells cells(1.0);
    const auto boundary = boundaries_of(cells, {20, 20});
    const DensityFit fit(boundary, 2);
    std::vector<double> count(40, 0.0);
    CHECK_FALSE(fit.fit(count));
    count[3] = 100.0;
    count[4] = 100.0;
    CHECK_FALSE(fit.fit(count));
}

TEST_CASE("the mean at an edge follows a parabola", "[weights]") {
    const EdgeCells cells(1.0);
    const auto boundary = boundaries_of(cells, {40, 70});
    std::vector<double> count, sum;
    for (std::size_t i = 0; i + 1 < boundary.size(); ++i) {
        const double y = 0.5 * (boundary[i] + boundary[i + 1]);
        count.push_back(100.0 + 50.0 * y);
        sum.push_back(count.back() * (1.75 + 0.3 * y - 0.2 * y * y));
    }
    CHECK(mean_at_edge(boundary, count, sum, 2) == Approx(1.75).epsilon(1e-12));
    const std::vector<double> nothing(count.size(), 0.0);
    CHECK(std::isnan(mean_at_edge(boundary, nothing, nothing, 2)));
}

TEST_CASE("cells hold what lies between their boundaries", "[weights]") {
    const EdgeCells cells(0.4);
    CHECK(cells.boundary(0) == 0.0);
    CHECK(cells.boundary(EdgeCells::a_side) == Approx(0.4).epsilon(1e-15));
    for (int k = 0; k < EdgeCells::a_side; ++k) {
        const double middle = 0.5 * (cells.boundary(k) + cells.boundary(k + 1));
        CHECK(cells.cell(middle, true) == static_cast<std::size_t>(EdgeCells::a_side + k));
        CHECK(cells.cell(middle, false) == static_cast<std::size_t>(EdgeCells::a_side - 1 - k));
        CHECK(cells.whole_cells_within(middle) == k);
    }
    CHECK(cells.whole_cells_within(0.4) == EdgeCells::a_side);
}
