// SPDX-License-Identifier: GPL-2.0-or-later
#include "ensemble/kernels.h"

#include <array>
#include <catch2/catch.hpp>
#include <cmath>
#include <map>
#include <utility>
#include <vector>

#include "deviascope/core/error.h"

using namespace deviascope;

namespace {

Stream stream_of(std::uint64_t draw) {
    return {20260817, Purpose::test, draw, 0, 0};
}

}  // namespace

TEST_CASE("stretch factors follow g(z) ~ z^-1/2 on 1/2 to 2", "[ensemble]") {
    // Goodman & Weare 2010, CAMCoS 5, 65: quantiles and moments from the closed forms
    // z(u) = ((a-1) u + 1)^2 / a, E z = (a + 1 + 1/a) / 3; E ln z integrated with mpmath.
    CHECK(stretch_factor(0.0) == 0.5);
    CHECK(stretch_factor(0.1) == Approx(0.605).epsilon(1e-15));
    CHECK(stretch_factor(0.25) == 0.78125);
    CHECK(stretch_factor(0.5) == 1.125);
    CHECK(stretch_factor(0.75) == 1.53125);
    CHECK(stretch_factor(0.9) == Approx(1.805).epsilon(1e-15));
    CHECK(stretch_factor(1.0) == 2.0);
    constexpr int n = 100000;
    double mean = 0.0, mean_of_square = 0.0, mean_of_log = 0.0;
    for (int cell = 0; cell < n; ++cell) {
        const double z = stretch_factor((cell + 0.5) / n);
        mean += z / n;
        mean_of_square += z * z / n;
        mean_of_log += std::log(z) / n;
    }
    CHECK(mean == Approx(7.0 / 6.0).epsilon(1e-9));
    CHECK(mean_of_square == Approx(1.55).epsilon(1e-9));
    CHECK(mean_of_log == Approx(0.079441541680).epsilon(1e-8));
}

TEST_CASE("a stretch move lies on the line through its partner", "[ensemble]") {
    const std::vector<double> others = {0.0, 0.0, 0.0, 10.0, 10.0, 10.0};
    const Partners partners{others.data(), 2, 3};
    const double x[] = {1.0, 2.0, 4.0};
    const KernelMix mix({1.0, 0.0, 0.0}, false);
    std::map<double, int> chosen;
    for (std::uint64_t draw = 0; draw < 2000; ++draw) {
        double y[3];
        Stream stream = stream_of(draw);
        const Proposal proposal = propose(mix, x, partners, nullptr, stream, y);
        REQUIRE(proposal.kernel == Kernel::stretch);
        const double z = std::exp(proposal.log_factor / 2.0);  // (n - 1) ln z
        REQUIRE(z >= 0.5 - 1e-12);
        REQUIRE(z <= 2.0 + 1e-12);
        // y = p + z (x - p), so p = (y - z x) / (1 - z).
        const double from = std::round((y[0] - z * x[0]) / (1.0 - z));
        ++chosen[from];
        for (const std::size_t axis : {0U, 1U, 2U})
            REQUIRE(y[axis] == Approx(from + z * (x[axis] - from)).margin(1e-12));
    }
    // Two partners, chosen alike: 1000 +- 22 each.
    CHECK(chosen.size() == 2);
    CHECK(std::abs(chosen[0.0] - 1000) < 100);
}

TEST_CASE("differential evolution adds a jittered difference of two unlike partners",
          "[ensemble]") {
    // Partners at (j, 3^j): the slope of a difference tells which two were chosen.
    std::vector<double> others;
    for (int walker = 0; walker < 6; ++walker) {
        others.push_back(walker);
        others.push_back(std::pow(3.0, walker));
    }
    const Partners partners{others.data(), 6, 2};
    const KernelMix mix({0.0, 1.0, 0.0}, false);
    const double base = 2.38 / std::sqrt(4.0);  // ter Braak 2006, n = 2
    const double x[] = {0.0, 0.0};
    std::map<std::pair<int, int>, int> pairs;
    int n_jumps = 0;
    constexpr int n_draws = 6000;
    for (std::uint64_t draw = 0; draw < n_draws; ++draw) {
        double y[2];
        Stream stream = stream_of(draw);
        const Proposal proposal = propose(mix, x, partners, nullptr, stream, y);
        REQUIRE(proposal.kernel == Kernel::differential_evolution);
        REQUIRE(proposal.log_factor == 0.0);
        int found = 0;
        for (int j = 0; j < 6; ++j)
            for (int k = 0; k < 6; ++k) {
                const double slope = (std::pow(3.0, j) - std::pow(3.0, k)) / (j - k);
                if (j == k || std::abs(y[1] / y[0] - slope) > 1e-9 * slope) continue;
                const double g = y[0] / (j - k);
                if (g < 0.0) continue;  // the same two, the other way round
                const bool is_jump = std::abs(g - 1.0) < 0.06;
                REQUIRE((is_jump || std::abs(g - base) < 0.06 * base));
                ++found;
                ++pairs[{j, k}];
                n_jumps += is_jump ? 1 : 0;
            }
        REQUIRE(found == 1);
    }
    CHECK(pairs.size() == 30);
    for (const auto& [pair, count] : pairs) CHECK(std::abs(count - 200) < 75);  // sd 14
    CHECK(std::abs(n_jumps - n_draws / 10) < 120);                              // sd 23
}

TEST_CASE("kernels are drawn with their fractions and never against them", "[ensemble]") {
    const KernelMix mix({0.4, 0.6, 0.0}, false);
    CHECK(mix.at(0.0) == Kernel::stretch);
    CHECK(mix.at(std::nextafter(0.4, 0.0)) == Kernel::stretch);
    CHECK(mix.at(0.4) == Kernel::differential_evolution);
    CHECK(mix.at(std::nextafter(1.0, 0.0)) == Kernel::differential_evolution);
    CHECK(KernelMix({1.0, 0.0, 0.0}, false).at(std::nextafter(1.0, 0.0)) == Kernel::stretch);
    CHECK(KernelMix({0.0, 1.0, 0.0}, false).at(0.0) == Kernel::differential_evolution);
    CHECK(KernelMix({0.2, 0.3, 0.5}, true).at(0.7) == Kernel::independence);
}

TEST_CASE("without an approximation the other kernels share the independence kernel's moves",
          "[ensemble]") {
    const KernelMix mix({0.2, 0.3, 0.5}, false);
    CHECK(mix.at(0.399) == Kernel::stretch);
    CHECK(mix.at(0.401) == Kernel::differential_evolution);
    CHECK(mix.at(0.999) == Kernel::differential_evolution);
    CHECK_THROWS_AS(KernelMix({0.0, 0.0, 1.0}, false), UsageError);
}

TEST_CASE("numbers of a move are drawn in the written order", "[ensemble]") {
    // kernel, partners, numbers of the kernel; acceptance is the next number of the stream.
    const std::vector<double> others = {1.0, 2.0, 3.0, 4.0};
    const Partners partners{others.data(), 4, 1};
    const double x = 10.0;
    for (std::uint64_t draw = 0; draw < 50; ++draw) {
        double y = 0.0;
        Stream stream = stream_of(draw);
        const Proposal proposal =
            propose(KernelMix({0.5, 0.5, 0.0}, false), &x, partners, nullptr, stream, &y);
        Stream again = stream_of(draw);
        const bool is_stretch = uniform(again) < 0.5;
        CHECK((proposal.kernel == Kernel::stretch) == is_stretch);
        const auto j = static_cast<std::size_t>(4.0 * uniform(again));
        if (is_stretch) {
            const double z = stretch_factor(uniform(again));
            CHECK(y == others[j] + z * (x - others[j]));
        } else {
            auto k = static_cast<std::size_t>(3.0 * uniform(again));
            k += k >= j ? 1 : 0;
            const double base = uniform(again) < 0.1 ? 1.0 : 2.38 / std::sqrt(2.0);
            const double jitter = 1.0 + 0.01 * normal(again);
            CHECK(y == x + base * jitter * (others[j] - others[k]));
        }
        CHECK(uniform(stream) == uniform(again));
    }
}
