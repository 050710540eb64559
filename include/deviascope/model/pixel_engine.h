// SPDX-License-Identifier: GPL-2.0-or-later
// counts -> MODEL -> ensemble
#pragma once

#include <Eigen/Core>
#include <memory>

#include "deviascope/counts/count_map.h"
#include "deviascope/model/parameter_space.h"

namespace deviascope {

/// The reference engine: sums over pixels. With y_p = ln(lambda_p / lambda0_p)
///   = -B ln gamma - B log1p(-beta.n_p) + log1p(r D.n_p)      (symbols of the README)
/// it gives, for a bin, X_b = sum_p n_p y_p and ln(E_b / E0_b),
///   E_b = Omega sum_p w_p exp(y_p),  E0_b = Omega sum_p w_p.
/// E_b / E0_b - 1 is summed as sum_p w_p expm1(y_p + B ln gamma) / sum_p w_p, so that a small
/// dipole costs no digits; where that would cancel or overflow (next to the walls),
/// ln(E_b/E0_b) is summed as exp(y_p - max y) instead.
///
/// Fixed pixel blocks are summed in block order and walkers are evaluated together, so that the
/// map is read once per block of walkers; each walker's sums are the same bits in any company
/// and with every instruction set. log1p(-beta.n) is computed once for all bins that share
/// their kept pixels, log1p(r D.n) once for those that also share dipole and bias ratio.
///
/// Accuracy: log1p and expm1 to 2 units in the last place; sums pairwise inside a block and
/// compensated between blocks. Errors in X_b - N_b ln(E_b/E0_b) below 1e-7 at 10^9 sources.
/// Threads: const members are pure.
class PixelEngine {
  public:
    /// Errors: InputError where a pixel holds more than 2^31 - 1 sources.
    PixelEngine(const Counts& counts, const ParameterSpace& space);
    ~PixelEngine();
    PixelEngine(PixelEngine&&) noexcept;

    /// For each bin term (rows, order of space.terms()) and walker (columns):
    /// @param parameters    n_parameters x n_walkers; monopoles are not read. |beta|, |r D| < 1
    /// @param counted       n_terms x n_walkers: X_b = sum_p n_p y_p
    /// @param log_expected  n_terms x n_walkers: ln(E_b / E0_b)
    void sums(const Eigen::Ref<const Eigen::MatrixXd>& parameters,
              Eigen::Ref<Eigen::MatrixXd> counted,
              Eigen::Ref<Eigen::MatrixXd> log_expected) const;

  private:
    struct Tables;
    std::unique_ptr<const Tables> tables_;
};

}  // namespace deviascope
