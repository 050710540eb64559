// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/moment_lanes.h"

#include <algorithm>
#include <cmath>

#include "counts/monomials.h"
#include "model/elementary.h"

namespace deviascope {
namespace {

constexpr std::size_t n_all = n_monomials(moment_degree);
using Monomials = Lanes[n_all];

/// Monomials beyond the degree of a walker are 0 in its lane.
[[gnu::always_inline]] inline void fill(const LaneSeries& series, Lanes* monomials) {
    monomials[0] = Lanes{} + 1.0;
    for (int degree = 1; degree <= series.highest; ++degree) {
        const Lanes keep = series.keep[static_cast<std::size_t>(degree)].value;
        fill_degree(series.vector[0].value * keep,
                    series.vector[1].value * keep,
                    series.vector[2].value * keep,
                    degree,
                    monomials);
    }
}

/// Means over the exposure that all bins of a group share.
struct Means {
    Lanes kinematic[moment_degree + 1];  ///< W_k(beta)
    Lanes mixed[moment_degree + 1];      ///< r D.g_k(beta)
    Lanes intrinsic;                     ///< sum_{k>=2} (-1)^(k+1) W_k(r D) / k
};

[[gnu::always_inline]] inline void fill_means(const MomentGroup& group,
                                              const LaneSeries& velocity,
                                              const Lanes* of_velocity,
                                              const LaneSeries& receding,
                                              const Lanes* of_receding,
                                              Means& means) {
    const double* __restrict coefficient = group.exposure.data();
    for (int degree = 0; degree <= velocity.highest; ++degree) {
        Lanes w{}, x{}, y{}, z{};
        for (std::size_t m = first_monomial(degree); m < n_monomials(degree); ++m) {
            w += coefficient[4 * m] * of_velocity[m];
            x += coefficient[4 * m + 1] * of_velocity[m];
            y += coefficient[4 * m + 2] * of_velocity[m];
            z += coefficient[4 * m + 3] * of_velocity[m];
        }
        const LaneVector& away = receding.vector;
        means.kinematic[degree] = w;
        means.mixed[degree] = -(away[0].value * x + away[1].value * y + away[2].value * z);
    }
    means.intrinsic = Lanes{};
    for (int degree = 2; degree <= receding.highest; ++degree) {
        Lanes w{};
        for (std::size_t m = first_monomial(degree); m < n_monomials(degree); ++m)
            w += coefficient[4 * m] * of_receding[m];
        means.intrinsic -= w * (1.0 / degree);
    }
}

/// Sums over k of dP_k / k for a chunk of bins.
[[gnu::always_inline]] inline void sum_excess(const MomentGroup& group,
                                              std::size_t first_bin,
                                              const Lanes* monomials,
                                              int highest,
                                              Lanes* sums) {
    const double* __restrict coefficient = group.excess.data() + first_bin;
    Lanes s0{}, s1{}, s2{}, s3{};
    for (std::size_t m = 1; m < n_monomials(highest); ++m) {
        const Lanes monomial = monomials[m];
        const double* __restrict of_bins = coefficient + m * group.n_padded;
        s0 += of_bins[0] * monomial;
        s1 += of_bins[1] * monomial;
        s2 += of_bins[2] * monomial;
        s3 += of_bins[3] * monomial;
    }
    static_assert(bins_per_chunk == 4);
    sums[0] = s0;
    sums[1] = s1;
    sums[2] = s2;
    sums[3] = s3;
}

/// ln(1 + x) - x, lane by lane where x is large.
[[gnu::always_inline]] inline void log1p_minus(const Lanes& x, Lanes& out) {
    using elementary::Reach;
    elementary::log1p_minus_near(x, out);
    for (std::size_t lane = 0; lane < n_lanes; ++lane)
        if (!(std::abs(x[lane]) <= elementary::log1p_near_bound))
            out[lane] = elementary::log1p<Reach::far>(x[lane]) - x[lane];
}

[[gnu::always_inline]] inline void finish(const MomentBin& bin,
                                          const Means& means,
                                          int highest,
                                          const Lanes& weight,
                                          const Lanes& excess,
                                          LaneNumber& balance,
                                          LaneNumber& log_excess) {
    Lanes x = means.mixed[0];
    Lanes h = means.intrinsic;
    Lanes c = Lanes{} + 1.0;  // C(B+k-1, k)
    for (int k = 1; k <= highest; ++k) {
        const double inverse = 1.0 / k;
        c = c * (weight + (k - 1.0)) * inverse;
        const Lanes mixed = c * means.mixed[k];
        x += c * means.kinematic[k] + mixed;
        if (k > 1) h += (weight * inverse - c) * means.kinematic[k];
        h -= mixed;
    }
    Lanes beyond;
    log1p_minus(x, beyond);
    balance.value = excess + bin.sources * (h - beyond);
    log_excess.value = x + beyond;
}

DEVIASCOPE_WIDEST_INSTRUCTIONS
void sum_group(const MomentGroup& group,
               const LaneWalkers& walkers,
               const Lanes* of_velocity,
               const LaneSeries& receding,
               LaneSums& sums) {
    Monomials of_receding;
    fill(receding, of_receding);
    Means means;
    fill_means(group, walkers.velocity, of_velocity, receding, of_receding, means);
    const int highest = walkers.velocity.highest;
    for (std::size_t first = 0; first < group.bins.size(); first += bins_per_chunk) {
        Lanes kinematic[bins_per_chunk], intrinsic[bins_per_chunk];
        sum_excess(group, first, of_velocity, highest, kinematic);
        sum_excess(group, first, of_receding, receding.highest, intrinsic);
        const std::size_t last = std::min(bins_per_chunk, group.bins.size() - first);
        for (std::size_t at = 0; at < last; ++at) {
            const MomentBin& bin = group.bins[first + at];
            const Lanes weight = walkers.weight[bin.term].value;
            finish(bin,
                   means,
                   highest,
                   weight,
                   weight * kinematic[at] - intrinsic[at],
                   sums.balance[bin.term],
                   sums.log_excess[bin.term]);
        }
    }
}

DEVIASCOPE_WIDEST_INSTRUCTIONS
void fill_velocity(const LaneSeries& velocity, Lanes* monomials) {
    fill(velocity, monomials);
}

}  // namespace

void sum_lanes(const std::vector<MomentGroup>& groups,
               const LaneWalkers& walkers,
               LaneSums& sums) {
    Monomials of_velocity;
    fill_velocity(walkers.velocity, of_velocity);
    for (std::size_t group = 0; group < groups.size(); ++group)
        sum_group(groups[group], walkers, of_velocity, walkers.receding[group], sums);
}

}  // namespace deviascope
