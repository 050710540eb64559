// SPDX-License-Identifier: GPL-2.0-or-later
// COUNTS, private: products of powers of three coordinates, in one order everywhere
#pragma once

#include <array>
#include <cstddef>
#include <vector>

namespace deviascope {

// Graded order: degree by degree; within degree k, first x times each of degree k-1 in its
// order, then y times those of degree k-1 without x, then z^k:
//   1 | x y z | xx xy xz yy yz zz | xxx xxy xxz xyy xyz xzz yyy yyz yzz zzz | ...

/// Number of monomials below a degree: the place of the first one of that degree.
constexpr std::size_t first_monomial(int degree) {
    const auto k = static_cast<std::size_t>(degree);
    return k * (k + 1) * (k + 2) / 6;
}
/// Number of monomials up to and with a degree.
constexpr std::size_t n_monomials(int degree) {
    return first_monomial(degree + 1);
}

/// Writes the monomials of one degree >= 1 after those of the degree before.
/// @param out  all monomials; those of degree - 1 are read
template <typename Number>
[[gnu::always_inline]] inline void fill_degree(
    const Number& x, const Number& y, const Number& z, int degree, Number* out) {
    const auto k = static_cast<std::size_t>(degree);
    const Number* before = out + first_monomial(degree - 1);
    Number* next = out + first_monomial(degree);
    const std::size_t n_before = k * (k + 1) / 2;
    for (std::size_t m = 0; m < n_before; ++m) *next++ = x * before[m];
    for (std::size_t m = n_before - k; m < n_before; ++m) *next++ = y * before[m];
    *next = z * before[n_before - 1];
}

/// Powers of x, y, z.
using Exponents = std::array<int, 3>;
/// Of all monomials up to a degree, in order.
std::vector<Exponents> monomial_exponents(int degree);
/// k! / (i! j! l!) of a monomial x^i y^j z^l of degree k: its factor in (x + y + z)^k.
double multinomial(const Exponents& exponents);
/// Place of a monomial in the order.
std::size_t monomial_index(const Exponents& exponents);

}  // namespace deviascope
