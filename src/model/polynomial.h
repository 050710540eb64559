// SPDX-License-Identifier: GPL-2.0-or-later
// MODEL, private: homogeneous parts of a polynomial in three variables, to second order
#pragma once

#include <Eigen/Core>
#include <cstddef>
#include <vector>

namespace deviascope {

/// Value, gradient and second derivatives.
struct Quadric {
    double value = 0.0;
    Eigen::Vector3d gradient = Eigen::Vector3d::Zero();
    Eigen::Matrix3d hessian = Eigen::Matrix3d::Zero();

    Quadric& operator+=(const Quadric& other);
};
Quadric operator*(double factor, const Quadric& quadric);

/// sum_{i+j+l = k} c_ijl x^i y^j z^l at v, for k = 0 … degree.
/// @param coefficients  of monomial m at [m * stride], in the order of counts/monomials.h
std::vector<Quadric> homogeneous_parts(const double* coefficients,
                                       std::size_t stride,
                                       int degree,
                                       const Eigen::Vector3d& v);

}  // namespace deviascope
