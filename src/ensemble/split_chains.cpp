// SPDX-License-Identifier: GPL-2.0-or-later
// Symbols of Vehtari et al. 2021: N draws per half chain, M half chains, S = N M.
#include "ensemble/split_chains.h"

#include <algorithm>
#include <array>
#include <cmath>
#include <limits>
#include <vector>

namespace deviascope {

namespace {

/// Sum of products in an order that depends on n alone.
double dot(const double* a, const double* b, std::size_t n) {
    constexpr std::size_t lanes = 8;
    std::array<double, lanes> sum{};
    std::size_t at = 0;
    for (; at + lanes <= n; at += lanes)
        for (std::size_t lane = 0; lane < lanes; ++lane)
            sum[lane] += a[at + lane] * b[at + lane];
    for (; at < n; ++at) sum[0] += a[at] * b[at];
    return ((sum[0] + sum[1]) + (sum[2] + sum[3])) + ((sum[4] + sum[5]) + (sum[6] + sum[7]));
}

/// The halves of the chains with their means taken off.
class CentredHalves {
  public:
    explicit CentredHalves(const Chains& chains)
        : n_(static_cast<std::size_t>(chains.n_draws() / 2)),
          n_chains_(static_cast<std::size_t>(chains.n_chains)),
          value_(chains.value.begin(), chains.value.end()),
          mean_(2 * n_chains_, 0.0) {
        for (const std::size_t half : {0U, 1U}) centre(half);
    }

    std::size_t n() const { return n_; }
    std::size_t n_halves() const { return mean_.size(); }

    /// Mean over the halves of acov_t, divisor N. Lagged products of all chains are one long
    /// sum because draws of all chains lie side by side.
    double autocovariance(std::size_t lag) const {
        const std::size_t n_products = (n_ - lag) * n_chains_;
        double sum = 0.0;
        for (const std::size_t half : {0U, 1U}) {
            const double* first = value_.data() + half * n_ * n_chains_;
            sum += dot(first, first + lag * n_chains_, n_products);
        }
        return sum / static_cast<double>(n_ * mean_.size());
    }

    /// Variance of the means, divisor M - 1: B / N.
    double variance_of_means() const {
        double centre = 0.0;
        for (const double mean : mean_) centre += mean;
        centre /= static_cast<double>(mean_.size());
        double sum = 0.0;
        for (const double mean : mean_) sum += (mean - centre) * (mean - centre);
        return sum / static_cast<double>(mean_.size() - 1);
    }

  private:
    /// Sums run over differences from the first draw, so that the mean of a constant chain is
    /// that constant to the last bit.
    void centre(std::size_t half) {
        double* first = value_.data() + half * n_ * n_chains_;
        double* mean = mean_.data() + half * n_chains_;
        for (std::size_t draw = 1; draw < n_; ++draw)
            for (std::size_t chain = 0; chain < n_chains_; ++chain)
                mean[chain] += first[draw * n_chains_ + chain] - first[chain];
        for (std::size_t chain = 0; chain < n_chains_; ++chain)
            mean[chain] = first[chain] + mean[chain] / static_cast<double>(n_);
        for (std::size_t draw = 0; draw < n_; ++draw)
            for (std::size_t chain = 0; chain < n_chains_; ++chain)
                first[draw * n_chains_ + chain] -= mean[chain];
    }

    std::size_t n_;
    std::size_t n_chains_;
    LargeArray value_;
    std::vector<double> mean_;
};

bool is_constant(const Chains& chains) {
    return std::all_of(chains.value.begin(), chains.value.end(), [&](double value) {
        return value == chains.value.front();
    });
}

bool has_no_answer(const Chains& chains) {
    return chains.n_draws() < 4 || is_constant(chains);
}

/// Within and total variance of the halves.
struct Variances {
    explicit Variances(const CentredHalves& halves) {
        const auto n = static_cast<double>(halves.n());
        const double biased = halves.autocovariance(0);
        within = biased * n / (n - 1.0);
        total = biased + halves.variance_of_means();
    }
    double within;  ///< W
    double total;   ///< var+
};

/// Sum of Geyer's pairs: the initial positive sequence made monotone.
double sum_of_pairs(const CentredHalves& halves, const Variances& variance) {
    const auto rho = [&](std::size_t lag) {
        return lag == 0 ? 1.0
                        : 1.0 - (variance.within - halves.autocovariance(lag)) / variance.total;
    };
    double sum = 0.0;
    double smallest = std::numeric_limits<double>::infinity();
    for (std::size_t lag = 0; lag + 1 < halves.n(); lag += 2) {
        const double even = rho(lag);
        const double pair = even + rho(lag + 1);
        if (!(pair > 0.0)) break;
        smallest = std::min(smallest, pair);
        sum += smallest;
    }
    return sum;
}

}  // namespace

LargeArray without_middle(const Chains& chains) {
    LargeArray kept(chains.value.begin(), chains.value.end());
    if (chains.n_draws() % 2 == 0) return kept;
    const auto middle = kept.begin() + chains.n_draws() / 2 * chains.n_chains;
    kept.erase(middle, middle + chains.n_chains);
    return kept;
}

double split_rhat(const Chains& chains) {
    if (has_no_answer(chains)) return std::numeric_limits<double>::quiet_NaN();
    const Variances variance{CentredHalves(chains)};
    return std::sqrt(variance.total / variance.within);
}

double split_effective_size(const Chains& chains) {
    if (has_no_answer(chains)) return std::numeric_limits<double>::quiet_NaN();
    const CentredHalves halves(chains);
    const Variances variance(halves);
    const auto n_draws = static_cast<double>(halves.n() * halves.n_halves());
    const double tau =
        std::max(-1.0 + 2.0 * sum_of_pairs(halves, variance), 1.0 / std::log10(n_draws));
    return n_draws / tau;
}

}  // namespace deviascope
