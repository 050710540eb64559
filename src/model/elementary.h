// SPDX-License-Identifier: GPL-2.0-or-later
// MODEL, private: log1p and expm1 without branches, so that loops over pixels vectorise
#pragma once

#include <bit>
#include <cstdint>
#include <numbers>

// Each function is a fixed sequence of IEEE additions, multiplications, divisions and integer
// operations on one double, so that a vectorised loop gives the same bits as a scalar one on
// every instruction set (the library is built with -ffp-contract=off). The constants are Taylor
// coefficients, not fits: the truncation bounds below are those of the series.
//
// `Reach::near` leaves out the argument reduction where the caller knows that it does nothing.

namespace deviascope::elementary {

enum class Reach {
    near,  ///< the argument is known to be small (bound beside each function)
    far    ///< any argument of the domain
};

/// ln 2 = ln2_high + ln2_low; ln2_high ends in 21 zero bits, so that k ln2_high is exact for
/// |k| < 2^21. Computed from 50 digits of ln 2.
inline constexpr double ln2_high = 0x1.62e42feep-1;
inline constexpr double ln2_low = 0x1.a39ef35793c76p-33;

/// Smallest argument that log1p tells from -1.
inline constexpr double log1p_lowest = -1.0 + 0x1p-53;
/// log1p: bound of |x| for Reach::near; 1 + x stays between sqrt(1/2) and sqrt(2).
inline constexpr double log1p_near = 0.29;
/// expm1: bound of |y| for Reach::near, below ln(2)/2.
inline constexpr double expm1_near = 0.34;
/// expm1_small: bound of |y|.
inline constexpr double expm1_small_reach = 0.0625;
/// expm1: |y| is cut off here.
inline constexpr double expm1_furthest = 708.0;

/// sum_{j=1..9} 2 s^2j / (2j+1), by Horner: 2 atanh(s)/s - 2.
[[gnu::always_inline]] inline double atanh_tail(double s_squared) {
    double sum = 2.0 / 19.0;
    sum = sum * s_squared + 2.0 / 17.0;
    sum = sum * s_squared + 2.0 / 15.0;
    sum = sum * s_squared + 2.0 / 13.0;
    sum = sum * s_squared + 2.0 / 11.0;
    sum = sum * s_squared + 2.0 / 9.0;
    sum = sum * s_squared + 2.0 / 7.0;
    sum = sum * s_squared + 2.0 / 5.0;
    sum = sum * s_squared + 2.0 / 3.0;
    return sum * s_squared;
}

/// ln(1 + x).
///
///   1 + x = 2^k (1 + f),  sqrt(1/2) <= 1 + f < sqrt(2),  s = f / (2 + f),
///   ln(1 + x) = k ln 2 + f - s (f - (2 atanh(s)/s - 2))
///
/// The rounding error of 1 + x is kept and goes into f, so that small x lose nothing.
/// Domain: |x| <= 1; below -1 + 2^-53 the value there, -36.74.  Near: |x| <= log1p_near.
/// Accuracy: 2 units in the last place (|s| < 0.1716: truncation 2.4e-17 relative).
template <Reach reach>
[[gnu::always_inline]] inline double log1p(double x) {
    if constexpr (reach == Reach::near) {
        const double s = x / (2.0 + x);
        return x - s * (x - atanh_tail(s * s));
    } else {
        const double inside = x < log1p_lowest ? log1p_lowest : x;
        const double u = 1.0 + inside;
        const double lost = inside - (u - 1.0);
        // Exponent arithmetic on the bits: subtract sqrt(1/2), keep the exponent field.
        const std::uint64_t bits = std::bit_cast<std::uint64_t>(u);
        const std::uint64_t above = bits - 0x3fe6a09e667f3bcdULL;
        const std::uint64_t exponent = above & 0xfff0000000000000ULL;
        const double mantissa = std::bit_cast<double>(bits - exponent);
        const double scale = std::bit_cast<double>(0x3ff0000000000000ULL - exponent);
        // k + 1024 in the low bits of 2^52 turns the integer into a double.
        const std::uint64_t shifted = (above + (1024ULL << 52U)) >> 52U;
        const double k =
            std::bit_cast<double>(0x4330000000000000ULL | shifted) - (0x1p52 + 1024.0);
        const double f = (mantissa - 1.0) + lost * scale;
        const double s = f / (2.0 + f);
        return k * ln2_high + (f - (s * (f - atanh_tail(s * s)) - k * ln2_low));
    }
}

/// (e^r - 1 - r) / r^2 to r^11 by Horner; |r| < 0.35: truncation 1.6e-17 of e^r - 1.
[[gnu::always_inline]] inline double exponential_tail(double r) {
    double sum = 1.0 / 6227020800.0;
    sum = sum * r + 1.0 / 479001600.0;
    sum = sum * r + 1.0 / 39916800.0;
    sum = sum * r + 1.0 / 3628800.0;
    sum = sum * r + 1.0 / 362880.0;
    sum = sum * r + 1.0 / 40320.0;
    sum = sum * r + 1.0 / 5040.0;
    sum = sum * r + 1.0 / 720.0;
    sum = sum * r + 1.0 / 120.0;
    sum = sum * r + 1.0 / 24.0;
    sum = sum * r + 1.0 / 6.0;
    return sum * r + 0.5;
}

/// e^y - 1.
///
///   y = k ln 2 + r + c,  |r| <= ln(2)/2,  e^y - 1 = 2^k (e^r - 1) + (2^k - 1)
///
/// c is what the reduction rounds away.
/// Domain: all; |y| is cut off at expm1_furthest.  Near: |y| <= expm1_near.
/// Accuracy: 2 units in the last place.
template <Reach reach>
[[gnu::always_inline]] inline double expm1(double y) {
    if constexpr (reach == Reach::near) {
        return y + y * y * exponential_tail(y);
    } else {
        const double below = y > expm1_furthest ? expm1_furthest : y;
        const double inside = below < -expm1_furthest ? -expm1_furthest : below;
        // Adding 1.5 * 2^52 rounds to the nearest integer, which is then in the low bits.
        const double rounded = inside * std::numbers::log2e + 0x1.8p52;
        const double k = rounded - 0x1.8p52;
        const std::uint64_t k_bits = std::bit_cast<std::uint64_t>(rounded) << 52U;
        const double power = std::bit_cast<double>(k_bits + 0x3ff0000000000000ULL);
        const double high = inside - k * ln2_high;
        const double low = k * ln2_low;
        const double r = high - low;
        const double c = (high - r) - low;
        const double reduced = r + (c + r * r * exponential_tail(r));
        return power * reduced + (power - 1.0);
    }
}

/// e^y - 1 for |y| <= expm1_small_reach: the series to y^9, truncation 4.1e-18 relative.
/// Accuracy: 2 units in the last place.
[[gnu::always_inline]] inline double expm1_small(double y) {
    double sum = 1.0 / 362880.0;
    sum = sum * y + 1.0 / 40320.0;
    sum = sum * y + 1.0 / 5040.0;
    sum = sum * y + 1.0 / 720.0;
    sum = sum * y + 1.0 / 120.0;
    sum = sum * y + 1.0 / 24.0;
    sum = sum * y + 1.0 / 6.0;
    sum = sum * y + 0.5;
    return y + y * y * sum;
}

}  // namespace deviascope::elementary
