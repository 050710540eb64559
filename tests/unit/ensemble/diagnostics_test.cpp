// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/ensemble/diagnostics.h"

#include <algorithm>
#include <array>
#include <boost/math/distributions/normal.hpp>
#include <catch2/catch.hpp>
#include <cmath>
#include <limits>
#include <numbers>
#include <numeric>
#include <vector>

#include "deviascope/core/random.h"

using namespace deviascope;

namespace {

double golden(int draw, int chain) {
    const double phi = (std::sqrt(5.0) - 1.0) / 2.0;
    const double sum = draw * phi + chain * std::sqrt(2.0);
    return sum - std::floor(sum);
}

/// 100 x 4: a low-discrepancy sequence with a slow wave.
Eigen::MatrixXd waves() {
    Eigen::MatrixXd chains(100, 4);
    for (int chain = 1; chain <= 4; ++chain)
        for (int draw = 1; draw <= 100; ++draw)
            chains(draw - 1, chain - 1) =
                golden(draw, chain) + 0.3 * std::sin(0.05 * draw * chain);
    return chains;
}

/// 250 x 4: AR(1) with coefficient 0.5, driven by the generator of Lewis, Goodman & Miller
/// 1969 (multiplier 16807, modulus 2^31 - 1).
Eigen::MatrixXd autoregressive() {
    Eigen::MatrixXd chains(250, 4);
    std::int64_t s = 12345;
    for (int chain = 1; chain <= 4; ++chain) {
        double x = 0.0;
        for (int draw = 0; draw < 250; ++draw) {
            double e = -6.0;
            for (int i = 0; i < 12; ++i) {
                s = 16807 * s % 2147483647;
                e += static_cast<double>(s) / 2147483647.0;
            }
            x = 0.5 * x + std::sqrt(0.75) * e;
            chains(draw, chain - 1) = x + 0.05 * (chain - 1);
        }
    }
    return chains;
}

/// 100 x 4: Cauchy tails, the last chain three times as wide.
Eigen::MatrixXd cauchy() {
    Eigen::MatrixXd chains(100, 4);
    for (int chain = 1; chain <= 4; ++chain)
        for (int draw = 1; draw <= 100; ++draw)
            chains(draw - 1, chain - 1) =
                std::tan(std::numbers::pi * (golden(draw, chain) - 0.5)) *
                (chain == 4 ? 3.0 : 1.0);
    return chains;
}

constexpr double ten_digits = 1e-10;

}  // namespace

// Values computed from the formulas of Vehtari et al. 2021 (Bayesian Analysis 16, 667) by two
// independent implementations that agree to 12 digits.
TEST_CASE("R-hat and effective draws of three data sets agree to ten digits", "[ensemble]") {
    struct Case {
        Eigen::MatrixXd chains;
        double first, last, rhat, bulk, tail;
    };
    const Case cases[] = {{waves(),
                           0.0472413019041933,
                           0.734136699700155,
                           1.02839964028,
                           96.5642067256,
                           430.370217289},
                          {autoregressive(),
                           -0.386420134196245,
                           0.0862005420052721,
                           1.00157602696,
                           385.660787134,
                           669.355649309},
                          {cauchy(),
                           std::numeric_limits<double>::quiet_NaN(),
                           std::numeric_limits<double>::quiet_NaN(),
                           1.04240193038,
                           902.811650042,
                           465.171489219}};
    for (const Case& one : cases) {
        if (!std::isnan(one.first)) {
            CHECK(one.chains(0, 0) == Approx(one.first).epsilon(1e-13));
            CHECK(one.chains(one.chains.rows() - 1, 3) == Approx(one.last).epsilon(1e-13));
        }
        CHECK(rank_normalised_split_rhat(one.chains) == Approx(one.rhat).epsilon(ten_digits));
        const EffectiveDraws found = effective_draws(one.chains);
        CHECK(found.bulk == Approx(one.bulk).epsilon(ten_digits));
        CHECK(found.tail == Approx(one.tail).epsilon(ten_digits));
    }
}

namespace {

/// The formulas of the paper once more, slowly and in long double: ranks by counting, one chain
/// at a time, every lag of the autocovariance.
namespace slow {

using Real = long double;
using Series = std::vector<std::vector<Real>>;  // [chain][draw]

Series series_of(const Eigen::MatrixXd& chains) {
    Series out(static_cast<std::size_t>(chains.cols()));
    for (Eigen::Index chain = 0; chain < chains.cols(); ++chain)
        for (Eigen::Index draw = 0; draw < chains.rows(); ++draw)
            out[static_cast<std::size_t>(chain)].push_back(chains(draw, chain));
    return out;
}

Series split(const Series& chains) {
    Series halves;
    for (const auto& chain : chains) {
        const auto half = static_cast<std::ptrdiff_t>(chain.size() / 2);
        halves.emplace_back(chain.begin(), chain.begin() + half);
        halves.emplace_back(chain.end() - half, chain.end());
    }
    return halves;
}

Series scores(const Series& chains) {
    std::vector<Real> all;
    for (const auto& chain : chains) all.insert(all.end(), chain.begin(), chain.end());
    const auto n = static_cast<Real>(all.size());
    Series out = chains;
    for (auto& chain : out)
        for (Real& x : chain) {
            const auto below =
                std::count_if(all.begin(), all.end(), [&](Real y) { return y < x; });
            const auto equal = std::count(all.begin(), all.end(), x);
            const Real rank = static_cast<Real>(below) + (static_cast<Real>(equal) + 1) / 2;
            x = boost::math::quantile(boost::math::normal_distribution<Real>(),
                                      (rank - 0.375L) / (n + 0.25L));
        }
    return out;
}

Real mean(const std::vector<Real>& chain) {
    return std::accumulate(chain.begin(), chain.end(), Real{0}) /
           static_cast<Real>(chain.size());
}

Real autocovariance(const std::vector<Real>& chain, std::size_t lag) {
    const Real centre = mean(chain);
    Real sum = 0;
    for (std::size_t draw = 0; draw + lag < chain.size(); ++draw)
        sum += (chain[draw] - centre) * (chain[draw + lag] - centre);
    return sum / static_cast<Real>(chain.size());
}

Real mean_autocovariance(const Series& chains, std::size_t lag) {
    Real sum = 0;
    for (const auto& chain : chains) sum += autocovariance(chain, lag);
    return sum / static_cast<Real>(chains.size());
}

struct Variance {
    Real within, total;
};

Variance variance(const Series& halves) {
    const auto n = static_cast<Real>(halves[0].size());
    std::vector<Real> means;
    for (const auto& half : halves) means.push_back(mean(half));
    const auto m = static_cast<Real>(means.size());
    const Real between = n * autocovariance(means, 0) * m / (m - 1);
    const Real within = mean_autocovariance(halves, 0) * n / (n - 1);
    return {within, (n - 1) / n * within + between / n};
}

Real rhat(const Series& halves) {
    const Variance v = variance(halves);
    return std::sqrt(v.total / v.within);
}

Real effective_size(const Series& halves) {
    const Variance v = variance(halves);
    std::vector<Real> pairs;
    for (std::size_t lag = 0; lag + 1 < halves[0].size(); lag += 2) {
        Real pair = 0;
        for (const std::size_t t : {lag, lag + 1})
            pair += t == 0 ? 1 : 1 - (v.within - mean_autocovariance(halves, t)) / v.total;
        if (pair <= 0) break;
        pairs.push_back(pairs.empty() ? pair : std::min(pair, pairs.back()));
    }
    const auto n = static_cast<Real>(halves.size() * halves[0].size());
    const Real sum = std::accumulate(pairs.begin(), pairs.end(), Real{0});
    return n / std::max(2 * sum - 1, 1 / std::log10(n));
}

std::vector<Real> sorted_values(const Series& chains) {
    std::vector<Real> all;
    for (const auto& chain : chains) all.insert(all.end(), chain.begin(), chain.end());
    std::sort(all.begin(), all.end());
    return all;
}

Real quantile(const Series& chains, Real p) {
    const std::vector<Real> all = sorted_values(chains);
    const Real position = p * static_cast<Real>(all.size() - 1);
    const auto below = static_cast<std::size_t>(position);
    const Real next = below + 1 < all.size() ? all[below + 1] : all[below];
    return all[below] + (position - static_cast<Real>(below)) * (next - all[below]);
}

template <class Function>
Series mapped(Series chains, Function function) {
    for (auto& chain : chains)
        for (Real& x : chain) x = function(x);
    return chains;
}

Real rank_normalised_rhat(const Series& chains) {
    // With an even number of draws the two middle ones tie in distance, or not, by the last bit
    // of the median: ties are a matter of doubles.
    const auto median = static_cast<double>(quantile(chains, 0.5L));
    const Series fold =
        mapped(chains, [&](Real x) { return std::abs(static_cast<double>(x) - median); });
    return std::max(rhat(scores(split(chains))), rhat(scores(split(fold))));
}

Real tail(const Series& chains, Real p) {
    const Real q = quantile(chains, p);
    return effective_size(split(mapped(chains, [&](Real x) { return Real(x <= q ? 1 : 0); })));
}

}  // namespace slow

/// Chains of a kind that is hard for the trial's number: strongly or negatively correlated,
/// heavy-tailed, full of ties, shifted, or of unequal width.
Eigen::MatrixXd hard_chains(std::uint64_t trial) {
    Stream stream(3, Purpose::test, trial, 0, 0);
    const auto n_draws = static_cast<Eigen::Index>(8 + 60 * uniform(stream));
    const auto n_chains = static_cast<Eigen::Index>(1 + 7 * uniform(stream));
    const double memory = std::array{0.0, 0.9, -0.7, 0.5, 0.99}[trial % 5];
    Eigen::MatrixXd chains(n_draws, n_chains);
    for (Eigen::Index chain = 0; chain < n_chains; ++chain) {
        double x = normal(stream);
        for (Eigen::Index draw = 0; draw < n_draws; ++draw) {
            x = memory * x + std::sqrt(1.0 - memory * memory) * normal(stream);
            double value = x;
            if (trial % 3 == 1) value = std::exp(3.0 * x);
            if (trial % 4 == 2) value = std::round(2.0 * value);
            if (trial % 7 == 3) value += 0.5 * static_cast<double>(chain);
            if (trial % 7 == 5) value *= static_cast<double>(1 + chain);
            chains(draw, chain) = value;
        }
    }
    return chains;
}

}  // namespace

TEST_CASE("diagnostics agree with the formulas worked slowly in long double", "[ensemble]") {
    // Bound: sums of at most 500 rounded products, well-conditioned because z has unit
    // variance; a pair lost at the zero crossing is itself of the size of the rounding.
    constexpr double bound = 1e-11;
    int n_tails = 0;
    for (std::uint64_t trial = 0; trial < 210; ++trial) {
        CAPTURE(trial);
        const Eigen::MatrixXd chains = hard_chains(trial);
        const slow::Series series = slow::series_of(chains);
        REQUIRE(rank_normalised_split_rhat(chains) ==
                Approx(static_cast<double>(slow::rank_normalised_rhat(series))).epsilon(bound));
        const EffectiveDraws found = effective_draws(chains);
        const auto bulk = slow::effective_size(slow::scores(slow::split(series)));
        REQUIRE(found.bulk == Approx(static_cast<double>(bulk)).epsilon(bound));
        if (std::isnan(found.tail)) continue;  // all draws on one side of a tied quantile
        ++n_tails;
        const auto tail = std::min(slow::tail(series, 0.05L), slow::tail(series, 0.95L));
        REQUIRE(found.tail == Approx(static_cast<double>(tail)).epsilon(bound));
    }
    CHECK(n_tails > 150);
}

TEST_CASE("diagnostics of series that have no answer are NaN", "[ensemble]") {
    const auto is_unknown = [](const Eigen::MatrixXd& chains) {
        const EffectiveDraws found = effective_draws(chains);
        return std::isnan(rank_normalised_split_rhat(chains)) && std::isnan(found.bulk) &&
               std::isnan(found.tail) && std::isnan(found.smaller());
    };
    CHECK(is_unknown(Eigen::MatrixXd(0, 0)));
    CHECK(is_unknown(Eigen::MatrixXd::Random(3, 4)));
    CHECK(is_unknown(Eigen::MatrixXd::Constant(100, 4, 3.0)));
    Eigen::MatrixXd chains = waves();
    chains(17, 2) = std::numeric_limits<double>::quiet_NaN();
    CHECK(is_unknown(chains));
    CHECK_FALSE(is_unknown(waves().topRows(4)));
    CHECK_FALSE(is_unknown(waves().leftCols(1)));
}

TEST_CASE("chains that stand still in unlike places have infinite R-hat", "[ensemble]") {
    Eigen::MatrixXd chains(40, 4);
    for (Eigen::Index chain = 0; chain < 4; ++chain)
        chains.col(chain).setConstant(static_cast<double>(chain * chain));
    CHECK(rank_normalised_split_rhat(chains) == std::numeric_limits<double>::infinity());
}

TEST_CASE("the smaller of bulk and tail is NaN where either is", "[ensemble]") {
    const double nan = std::numeric_limits<double>::quiet_NaN();
    CHECK(EffectiveDraws{2.0, 3.0}.smaller() == 2.0);
    CHECK(EffectiveDraws{3.0, 2.0}.smaller() == 2.0);
    CHECK(std::isnan(EffectiveDraws{nan, 2.0}.smaller()));
    CHECK(std::isnan(EffectiveDraws{2.0, nan}.smaller()));
}

namespace {

/// Rows of one parameter with a little memory, replicate means apart by `apart`.
Draws rows_of_one_parameter(Eigen::Index n_rows, Eigen::Index n_walkers, double apart) {
    Draws draws;
    draws.n_rows = n_rows;
    draws.n_replicates = 3;
    draws.n_walkers = n_walkers;
    draws.n_parameters = 1;
    std::vector<double> last(static_cast<std::size_t>(3 * n_walkers), 0.0);
    Stream stream(5, Purpose::test, 0, 0, 0);
    for (Eigen::Index row = 0; row < n_rows; ++row)
        for (std::size_t series = 0; series < last.size(); ++series) {
            last[series] = 0.6 * last[series] + normal(stream);
            const auto replicate = static_cast<Eigen::Index>(series) / n_walkers;
            draws.value.push_back(last[series] + apart * static_cast<double>(replicate));
        }
    return draws;
}

}  // namespace

TEST_CASE("walkers and replicates are arranged as chains of their own", "[ensemble]") {
    const MonitoredScalar scalar{"x0", MonitoredScalar::Kind::parameter, 0, 0};
    for (const Eigen::Index n_rows : {20, 21})
        for (const Eigen::Index n_walkers : {7, 8, 40}) {
            const Draws draws = rows_of_one_parameter(n_rows, n_walkers, 0.5);
            const Eigen::Index looked = std::min<Eigen::Index>(n_walkers, 32);
            Eigen::MatrixXd by_walker(n_rows, 3 * looked);
            Eigen::MatrixXd by_replicate(n_rows * looked, 3);
            for (Eigen::Index row = 0; row < n_rows; ++row)
                for (Eigen::Index replicate = 0; replicate < 3; ++replicate)
                    for (Eigen::Index walker = 0; walker < looked; ++walker) {
                        const double value = draws.at(row, replicate, walker, 0);
                        by_walker(row, replicate * looked + walker) = value;
                        by_replicate(row * looked + walker, replicate) = value;
                    }
            const ScalarDiagnostics found = diagnose(scalar, draws, 6);
            const double scale = static_cast<double>(n_walkers) / static_cast<double>(looked);
            CHECK(found.name == "x0");
            CHECK(found.walker_rhat == Approx(rank_normalised_split_rhat(by_walker)));
            CHECK(found.replicate_rhat == Approx(rank_normalised_split_rhat(by_replicate)));
            CHECK(found.bulk == Approx(scale * effective_draws(by_walker).bulk));
            CHECK(found.tail == Approx(scale * effective_draws(by_walker).tail));
            // tau = steps per row x rows x replicates x walkers / bulk
            CHECK(found.autocorrelation_steps ==
                  Approx(6.0 * static_cast<double>(n_rows * 3 * n_walkers) / found.bulk));
            CHECK(found.worst_rhat() == std::max(found.walker_rhat, found.replicate_rhat));
        }
}

TEST_CASE("replicates that agree on wrong lobe weights are told by their walkers",
          "[ensemble]") {
    // Half of the walkers of every replicate in either of two lobes, none ever changing over.
    Draws draws = rows_of_one_parameter(60, 8, 0.0);
    for (std::size_t at = 0; at < draws.value.size(); ++at)
        draws.value[at] += at % 2 == 0 ? 10.0 : -10.0;
    const ScalarDiagnostics found =
        diagnose({"x0", MonitoredScalar::Kind::parameter, 0, 0}, draws, 1);
    CHECK(found.replicate_rhat < 1.01);
    CHECK(found.walker_rhat > 1.5);
}
