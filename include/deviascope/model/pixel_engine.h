// SPDX-License-Identifier: GPL-2.0-or-later
// counts -> MODEL -> ensemble
#pragma once

#include <Eigen/Core>
#include <memory>

#include "deviascope/counts/count_map.h"
#include "deviascope/model/parameter_space.h"

namespace deviascope {

/// The reference engine: sums over pixels. With y_p = ln(lambda_p / lambda0_p)
///   = -B ln gamma - B log1p(-beta.n_p) + log1p(r D.n_p),
///   E_b - E0_b = Omega sum_p w_p expm1(y_p),  X_b = sum_p n_p y_p   (all in design section 3).
///
/// Fixed pixel blocks are summed in block order and walkers are evaluated together, so that the
/// map is read once per block of walkers; each walker's sums are the same bits in any company.
class PixelEngine {
  public:
    PixelEngine(const Counts& counts, const ParameterSpace& space);
    ~PixelEngine();
    PixelEngine(PixelEngine&&) noexcept;

    /// For each bin term (rows, order of space.terms()) and walker (columns):
    /// @param parameters      n_parameters x n_walkers; monopoles are not read. |beta|, |r D| <
    /// 1
    /// @param counted         n_terms x n_walkers: sum_p n_p y_p
    /// @param excess          n_terms x n_walkers: E_b / E0_b - 1
    void sums(const Eigen::Ref<const Eigen::MatrixXd>& parameters,
              Eigen::Ref<Eigen::MatrixXd> counted,
              Eigen::Ref<Eigen::MatrixXd> excess) const;

  private:
    struct Tables;
    std::unique_ptr<const Tables> tables_;
};

}  // namespace deviascope
