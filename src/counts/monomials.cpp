// SPDX-License-Identifier: GPL-2.0-or-later
#include "counts/monomials.h"

namespace deviascope {

std::size_t monomial_index(const Exponents& exponents) {
    const auto yz = static_cast<std::size_t>(exponents[1] + exponents[2]);
    const auto z = static_cast<std::size_t>(exponents[2]);
    const int degree = exponents[0] + exponents[1] + exponents[2];
    return first_monomial(degree) + yz * (yz + 1) / 2 + z;
}

std::vector<Exponents> monomial_exponents(int degree) {
    std::vector<Exponents> all(n_monomials(degree));
    for (int k = 0; k <= degree; ++k)
        for (int z = 0; z <= k; ++z)
            for (int y = 0; y <= k - z; ++y) {
                const Exponents one = {k - y - z, y, z};
                all[monomial_index(one)] = one;
            }
    return all;
}

double multinomial(const Exponents& exponents) {
    double product = 1.0;
    int n = 0;
    for (const int exponent : exponents)
        for (int i = 1; i <= exponent; ++i) product = product * ++n / i;
    return product;
}

}  // namespace deviascope
