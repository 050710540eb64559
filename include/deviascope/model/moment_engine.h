// SPDX-License-Identifier: GPL-2.0-or-later
// counts -> MODEL -> ensemble
#pragma once

#include <Eigen/Core>
#include <memory>
#include <span>

#include "deviascope/counts/count_map.h"
#include "deviascope/model/parameter_space.h"

namespace deviascope {

struct BinExpansion;

/// The fast engine: the likelihood as a series in moments of the counts (counts/moments.h).
/// With W_k(v) = <(v.n)^k> over the exposure, g_k(v) = <n (v.n)^k> and dP_k(v) the excess
/// moments, for a bin of N sources, kinematic weight B, velocity beta and bias ratio times
/// intrinsic dipole d = r D:
///
///   x = sum_{k=1..K} c_k W_k(beta) + sum_{k=0..K} c_k d.g_k(beta),   c_k = C(B+k-1, k)
///   H = sum_{k=2..K} [(B/k - c_k) W_k(beta) + (-1)^(k+1) W_k(d)/k] - sum_{k=1..K} c_k
///   d.g_k(beta) X = sum_{k=1..K} [B dP_k(beta) + (-1)^(k+1) dP_k(d)] / k E/E0 = gamma^-B (1 +
///   x),   balance = X + N (H - (log1p(x) - x))
///
/// `balance` is sum_p n_p y_p - N ln(E/E0), the log-likelihood with the monopole integrated out
/// under 1/M (see PixelEngine for y_p, E).
///
/// Degrees: the lowest for velocity and for intrinsic dipole that keep the error of ln L below
/// half the tolerance each, walker by walker, from its own parameters. With b = |beta|,
/// d = |r D|, B the largest |B| of all bins:
///   counts, velocity   <= sum_b |B_b| N_b b^(K+1) / ((K+1)(1-b))
///   counts, intrinsic  <= sum_b N_b d^(K+1) / ((K+1)(1-d))
///   expected           T = (1+d) C(B+K, K+1) b^(K+1) / (1-rho),  rho = b max(1,
///   (B+K+1)/(K+2)):
///     monopole integrated out  (N_b + a) T / (E - T) with E >= (1-d)(1 - max(1, B) b),
///     sampled                  M E0 T / (1 - max(1, B) b)
/// N, M E0 divided by the dispersion. Rounding adds less than 4 units in the last place of the
/// sum of the absolute terms.
///
/// Walkers are the lanes; each walker's sums are the same bits in any company, on any thread
/// and with every instruction set. Threads: const members are pure.
/// Source: design section 3; derivation in DEVELOPERS.md.
class MomentEngine {
  public:
    /// Counts without moments are given them. @param tolerance  of ln L, above 0
    MomentEngine(const Counts& counts, const ParameterSpace& space, double tolerance);
    ~MomentEngine();
    MomentEngine(MomentEngine&&) noexcept;

    /// Degrees at which a walker's series are cut; 0, 0 where no degree up to moment_degree
    /// keeps the bound, and another engine must answer.
    struct Degrees {
        int velocity = 0, intrinsic = 0;
        bool are_enough() const { return velocity > 0; }
    };
    /// @param row  parameters of a walker, inside the walls; monopoles are read if sampled
    Degrees degrees_for(const Eigen::Ref<const Eigen::VectorXd>& row) const;

    /// For each bin term (rows, order of space.terms()) and walker (columns):
    /// @param parameters    n_parameters x n_walkers; inside the walls
    /// @param walkers       columns to do; the others are left alone
    /// @param degrees       of each of these, enough
    /// @param balance       n_terms x n_walkers: sum_p n_p y_p - N ln(E/E0)
    /// @param log_expected  n_terms x n_walkers: ln(E/E0)
    void sums(const Eigen::Ref<const Eigen::MatrixXd>& parameters,
              std::span<const Eigen::Index> walkers,
              std::span<const Degrees> degrees,
              Eigen::Ref<Eigen::MatrixXd> balance,
              Eigen::Ref<Eigen::MatrixXd> log_expected) const;

    /// A term and its first and second derivatives, series to the highest degree.
    BinExpansion expansion(std::size_t term,
                           const Eigen::Ref<const Eigen::VectorXd>& row) const;

  private:
    struct Tables;
    std::unique_ptr<const Tables> tables_;
};

}  // namespace deviascope
