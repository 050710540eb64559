// SPDX-License-Identifier: GPL-2.0-or-later
#include <catch2/catch.hpp>
#include <cmath>

#include "counts/monomials.h"
#include "deviascope/counts/moments.h"
#include "synthetic_counts.h"

using namespace deviascope;

namespace {

std::vector<synthetic::Survey> surveys() {
    const auto cap = [](const Direction& n) {
        return n.z() > -0.3 ? 0.3 + 0.7 * n.x() * n.x() : 0.0;
    };
    return {{"dunlin", {{"faint", 4e8, 3.0}, {"bright", 70, 5.0}}, {0.05, -0.02, 0.01}, cap},
            {"lantern", {{"one", 1e5, 2.0}}}};
}

long double monomial(const Direction& n, const Exponents& powers) {
    long double product = 1.0L;
    for (std::size_t axis = 0; axis < 3; ++axis)
        for (int i = 0; i < powers[axis]; ++i)
            product *= static_cast<long double>(n[static_cast<int>(axis)]);
    return product;
}

}  // namespace

TEST_CASE("monomials stand where their exponents say", "[counts]") {
    CHECK(n_monomials(0) == 1);
    CHECK(n_monomials(8) == 165);
    CHECK(n_monomials(9) == 220);
    const std::vector<Exponents> exponents = monomial_exponents(9);
    std::vector<double> filled(exponents.size());
    filled[0] = 1.0;
    for (int degree = 1; degree <= 9; ++degree)
        fill_degree(0.7, -1.3, 2.1, degree, filled.data());
    for (std::size_t m = 0; m < exponents.size(); ++m) {
        CHECK(monomial_index(exponents[m]) == m);
        CHECK(filled[m] ==
              Approx(std::pow(0.7, exponents[m][0]) * std::pow(-1.3, exponents[m][1]) *
                     std::pow(2.1, exponents[m][2])));
    }
    double sum = 0.0;  // (x + y + z)^6 at 1, 1, 1
    for (std::size_t m = first_monomial(6); m < n_monomials(6); ++m)
        sum += multinomial(exponents[m]);
    CHECK(sum == 729.0);
}

TEST_CASE("moments equal 80-bit sums over the pixels", "[counts]") {
    Counts counts = synthetic::make_counts(16, {0.01, 0.0, 0.02}, surveys(), 41);
    CHECK_FALSE(has_moments(counts));
    add_moments(counts);
    REQUIRE(has_moments(counts));
    const Pixelisation grid(counts.nside);
    const std::vector<Exponents> exponents = monomial_exponents(9);
    for (const SurveyCounts& survey : counts.surveys) {
        const Footprint& footprint = survey.footprints[0];
        long double exposed = 0.0L;
        for (const double w : footprint.exposure) exposed += static_cast<long double>(w);
        for (std::size_t m = 0; m < exponents.size(); m += 7) {
            std::vector<long double> sums(1 + survey.bins.size(), 0.0L);
            for (std::size_t p = 0; p < footprint.pixel.size(); ++p) {
                const long double at = monomial(grid.centre(footprint.pixel[p]), exponents[m]);
                const auto w = static_cast<long double>(footprint.exposure[p]) / exposed;
                sums[0] += w * at;
                for (std::size_t b = 0; b < survey.bins.size(); ++b)
                    sums[b + 1] += (static_cast<long double>(survey.bins[b].count[p]) -
                                    static_cast<long double>(survey.bins[b].total()) * w) *
                                   at;
            }
            CHECK(std::abs(footprint.moment[m] - static_cast<double>(sums[0])) < 1e-15);
            if (m >= n_monomials(8)) continue;
            for (std::size_t b = 0; b < survey.bins.size(); ++b) {
                const double n = static_cast<double>(survey.bins[b].total());
                const double bound = 1e-13 * std::sqrt(n) + 1e-15 * n / 50.0;
                INFO(survey.bins[b].name << " monomial " << m);
                CHECK(std::abs(survey.bins[b].excess_moment[m] -
                               static_cast<double>(sums[b + 1])) < bound);
            }
        }
    }
}

TEST_CASE("moments that are there are not computed again", "[counts]") {
    Counts counts = synthetic::make_counts(4, {0.01, 0.0, 0.02}, surveys(), 42);
    add_moments(counts);
    counts.surveys[0].bins[0].excess_moment[1] += 5.0;
    const double changed = counts.surveys[0].bins[0].excess_moment[1];
    add_moments(counts);
    CHECK(counts.surveys[0].bins[0].excess_moment[1] == changed);
}

TEST_CASE("the excess of an isotropic sky is nothing", "[counts]") {
    Counts counts =
        synthetic::make_counts(4, {0.0, 0.0, 0.0}, {{"even", {{"all", 1e4, 2.0}}}}, 43);
    for (std::uint32_t& count : counts.surveys[0].bins[0].count) count = 17;
    add_moments(counts);
    for (const double moment : counts.surveys[0].bins[0].excess_moment)
        CHECK(std::abs(moment) < 1e-12);
}
