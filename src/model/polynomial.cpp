// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/polynomial.h"

#include <array>

#include "counts/monomials.h"

namespace deviascope {
namespace {

/// d^order/dx^order of x^exponent.
double power(double x, int exponent, int order) {
    double value = 1.0;
    for (int i = 0; i < order; ++i) value *= exponent - i;
    if (value == 0.0) return 0.0;
    for (int i = order; i < exponent; ++i) value *= x;
    return value;
}

/// A monomial, differentiated `order` times along each axis.
double derivative(const Exponents& exponents,
                  const std::array<int, 3>& order,
                  const Eigen::Vector3d& v) {
    double product = 1.0;
    for (std::size_t axis = 0; axis < 3; ++axis)
        product *= power(v[static_cast<int>(axis)], exponents[axis], order[axis]);
    return product;
}

Quadric monomial_at(const Exponents& exponents, const Eigen::Vector3d& v) {
    Quadric quadric;
    quadric.value = derivative(exponents, {0, 0, 0}, v);
    for (std::size_t row = 0; row < 3; ++row) {
        std::array<int, 3> order{};
        order[row] = 1;
        quadric.gradient[static_cast<int>(row)] = derivative(exponents, order, v);
        for (std::size_t column = 0; column < 3; ++column) {
            std::array<int, 3> second = order;
            ++second[column];
            quadric.hessian(static_cast<int>(row), static_cast<int>(column)) =
                derivative(exponents, second, v);
        }
    }
    return quadric;
}

}  // namespace

Quadric& Quadric::operator+=(const Quadric& other) {
    value += other.value;
    gradient += other.gradient;
    hessian += other.hessian;
    return *this;
}

Quadric operator*(double factor, const Quadric& quadric) {
    return {factor * quadric.value, factor * quadric.gradient, factor * quadric.hessian};
}

std::vector<Quadric> homogeneous_parts(const double* coefficients,
                                       std::size_t stride,
                                       int degree,
                                       const Eigen::Vector3d& v) {
    const std::vector<Exponents> monomials = monomial_exponents(degree);
    std::vector<Quadric> parts(static_cast<std::size_t>(degree) + 1);
    for (std::size_t m = 0; m < monomials.size(); ++m) {
        const Exponents& e = monomials[m];
        parts[static_cast<std::size_t>(e[0] + e[1] + e[2])] +=
            coefficients[m * stride] * monomial_at(e, v);
    }
    return parts;
}

}  // namespace deviascope
