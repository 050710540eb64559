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
// `Reach` leaves out what a small argument does not need: the caller knows a bound.

namespace deviascope::elementary {

enum class Reach {
    tiny,   ///< |y| <= 1/64 (expm1 only)
    small,  ///< |x|, |y| <= 1/16
    near,   ///< |x| <= 0.29, |y| <= 0.34: the argument reduction would do nothing
    far     ///< any argument of the domain
};

inline constexpr double tiny_bound = 1.0 / 64.0;
inline constexpr double small_bound = 1.0 / 16.0;
/// 1 + x stays between sqrt(1/2) and sqrt(2).
inline constexpr double log1p_near_bound = 0.29;
/// Below ln(2)/2.
inline constexpr double expm1_near_bound = 0.34;

/// ln 2 = ln2_high + ln2_low; ln2_high ends in 21 zero bits, so that k ln2_high is exact for
/// |k| < 2^21. Computed from 50 digits of ln 2.
inline constexpr double ln2_high = 0x1.62e42feep-1;
inline constexpr double ln2_low = 0x1.a39ef35793c76p-33;

/// Smallest argument that log1p tells from -1.
inline constexpr double log1p_lowest = -1.0 + 0x1p-53;
/// expm1: |y| is cut off here.
inline constexpr double expm1_furthest = 708.0;

/// sum_{j=first..last} 2 s^2(j-first) / (2j+1), by Horner.
template <int first, int last>
[[gnu::always_inline]] inline double atanh_series(double s_squared) {
    constexpr double coefficient = 2.0 / (2.0 * first + 1.0);
    if constexpr (first == last)
        return coefficient;
    else
        return atanh_series<first + 1, last>(s_squared) * s_squared + coefficient;
}

/// 2 atanh(s)/s - 2. Truncation, relative to 2 atanh(s): 2.4e-17 for |s| < 0.1716, where 1 + x
/// is between sqrt(1/2) and sqrt(2); 2e-19 for |s| < 0.0323, where |x| <= 1/16.
template <Reach reach>
[[gnu::always_inline]] inline double atanh_tail(double s) {
    const double s_squared = s * s;
    constexpr int last = reach == Reach::small ? 5 : 9;
    return atanh_series<1, last>(s_squared) * s_squared;
}

/// ln(1 + x).
///
///   1 + x = 2^k (1 + f),  sqrt(1/2) <= 1 + f < sqrt(2),  s = f / (2 + f),
///   ln(1 + x) = k ln 2 + f - s (f - (2 atanh(s)/s - 2))
///
/// The rounding error of 1 + x is kept and goes into f, so that small x lose nothing.
/// Domain: |x| <= 1; below -1 + 2^-53 the value there, -36.74.
/// Accuracy: 2 units in the last place.
template <Reach reach>
[[gnu::always_inline]] inline double log1p(double x) {
    static_assert(reach != Reach::tiny);
    if constexpr (reach != Reach::far) {
        const double s = x / (2.0 + x);
        return x - s * (x - atanh_tail<reach>(s));
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
        return k * ln2_high + (f - (s * (f - atanh_tail<reach>(s)) - k * ln2_low));
    }
}

/// ln(1 + x) - x for |x| <= log1p_near_bound, where no lane needs the argument reduction.
/// `Number`: double, or lanes of it (hence no return value: it would depend on the instruction
/// set). Accuracy: 3 units in the last place.
template <typename Number>
[[gnu::always_inline]] inline void log1p_minus_near(const Number& x, Number& result) {
    const Number s = x / (2.0 + x);
    const Number s_squared = s * s;
    Number tail = Number{} + 2.0 / 19.0;  // 2 atanh(s)/s - 2, as atanh_tail<Reach::near>
    for (int j = 8; j >= 1; --j) tail = tail * s_squared + 2.0 / (2.0 * j + 1.0);
    result = s * (tail * s_squared - x);
}

constexpr double factorial(int n) {
    return n < 2 ? 1.0 : n * factorial(n - 1);
}

/// sum_{k=first..last} r^(k-first) / k!, by Horner.
template <int first, int last>
[[gnu::always_inline]] inline double exponential_series(double r) {
    constexpr double coefficient = 1.0 / factorial(first);
    if constexpr (first == last)
        return coefficient;
    else
        return exponential_series<first + 1, last>(r) * r + coefficient;
}

/// e^r - 1 - r. Truncation, relative to e^r - 1: 6e-18 (tiny), 4e-18 (small), 2e-17 (|r| <
/// 0.35).
template <Reach reach>
[[gnu::always_inline]] inline double exponential_tail(double r) {
    constexpr int last = reach == Reach::tiny ? 7 : reach == Reach::small ? 9 : 13;
    return r * r * exponential_series<2, last>(r);
}

/// e^y - 1.
///
///   y = k ln 2 + r + c,  |r| <= ln(2)/2,  e^y - 1 = 2^k (e^r - 1) + (2^k - 1)
///
/// c is what the reduction rounds away.
/// Domain: all; |y| is cut off at expm1_furthest.
/// Accuracy: 2 units in the last place.
template <Reach reach>
[[gnu::always_inline]] inline double expm1(double y) {
    if constexpr (reach != Reach::far) {
        return y + exponential_tail<reach>(y);
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
        const double reduced = r + (c + exponential_tail<reach>(r));
        return power * reduced + (power - 1.0);
    }
}

}  // namespace deviascope::elementary
