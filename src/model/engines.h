// SPDX-License-Identifier: GPL-2.0-or-later
// MODEL, private: both engines behind one face
#pragma once

#include <optional>

#include "deviascope/model/model_options.h"
#include "deviascope/model/moment_engine.h"
#include "deviascope/model/pixel_engine.h"
#include "model/bin_expansion.h"

namespace deviascope {

/// Sends each walker to the engine that answers for it, by its own parameters alone.
class Engines {
  public:
    Engines(const Counts& counts, const ParameterSpace& space);

    /// Sums of bins for a block of rows, all inside the walls.
    struct Sums {
        Eigen::MatrixXd balance, log_expected;  ///< n_terms x n_walkers, as MomentEngine::sums
        Eigen::Index by_moments = 0;            ///< walkers that the moment engine answered
    };
    Sums sums(const Eigen::Ref<const Eigen::MatrixXd>& rows) const;

    /// A term to second order, by the engine that answers for the row.
    BinExpansion expansion(const Counts& counts,
                           std::size_t term,
                           const Eigen::Ref<const Eigen::VectorXd>& row) const;

  private:
    void add_pixel_sums(const Eigen::Ref<const Eigen::MatrixXd>& rows,
                        std::span<const Eigen::Index> columns,
                        Sums& sums) const;

    const ParameterSpace& space_;
    Eigen::VectorXd sources_;  ///< N of each term
    PixelEngine pixel_;
    std::optional<MomentEngine> moment_;
};

/// ln L of one walker: its bins added in job order.
/// @param rows  parameters, one walker a column; sampled monopoles are read
double log_likelihood(const ParameterSpace& space,
                      const std::vector<BinTotals>& totals,
                      const Eigen::Ref<const Eigen::MatrixXd>& rows,
                      const Engines::Sums& sums,
                      Eigen::Index walker);

}  // namespace deviascope
