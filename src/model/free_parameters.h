// SPDX-License-Identifier: GPL-2.0-or-later
// MODEL, private: what fits move
#pragma once

#include <Eigen/Core>

#include "deviascope/counts/count_map.h"
#include "deviascope/model/parameter_space.h"

namespace deviascope {

/// d (row of parameters, monopoles as ln M) / d (free parameters): n_parameters x
/// n_coordinates. Free parameters are one a coordinate and in their order, but vectors under
/// `uniform-amplitude` stay vectors (a Gaussian in u would be a poor picture of one in v), and
/// a sampled monopole is ln M.
Eigen::MatrixXd free_directions(const ParameterSpace& space);

/// Free parameters counted from an origin: free vectors 0, fixed ones at their values, weights
/// at their prior means, sampled monopoles at (N + a) / (E0 + b), redrawn ones NaN.
class FreeParameters {
  public:
    FreeParameters(const Counts& counts, const ParameterSpace& space);

    Eigen::Index size() const { return directions_.cols(); }
    const Eigen::MatrixXd& directions() const { return directions_; }
    const ParameterSpace& space() const { return *space_; }
    /// A full row of parameters.
    Eigen::VectorXd row_at(const Eigen::Ref<const Eigen::VectorXd>& free) const;
    /// The coordinates of the sampler; vectors beyond a prior's ball included.
    Eigen::VectorXd coordinates_at(const Eigen::Ref<const Eigen::VectorXd>& free) const;

    /// Where vector `v` begins, and how many free parameters it has (3, 1 or 0).
    Eigen::Index first_of(std::size_t v) const;
    Eigen::Index size_of(std::size_t v) const;
    /// Largest length of vector `v`: of its prior's support, and less than 1 / |r| for each
    /// bin.
    double furthest(std::size_t v) const;

    /// A point inside all supports: 0, and the middle of the range along an axis.
    Eigen::VectorXd inside() const;
    /// True where every vector is inside the support of its prior and the walls.
    bool is_inside(const Eigen::Ref<const Eigen::VectorXd>& free) const;
    /// Largest t in 0 … 1 with from + t step inside; from lies inside.
    double longest_step(const Eigen::Ref<const Eigen::VectorXd>& from,
                        const Eigen::Ref<const Eigen::VectorXd>& step) const;

  private:
    const ParameterSpace* space_;
    Eigen::VectorXd origin_;
    Eigen::MatrixXd directions_;
};

}  // namespace deviascope
