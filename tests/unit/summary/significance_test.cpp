// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/summary/significance.h"

#include <catch2/catch.hpp>
#include <cmath>
#include <limits>

using namespace deviascope;

TEST_CASE("levels of a chi-square with three degrees of freedom", "[summary]") {
    // p = erfc(sqrt(X/2)) + sqrt(2X/pi) e^(-X/2), sigma = sqrt(2) erfinv(1 - p); values equal
    // to scipy.stats.chi2.sf and scipy.special.erfinv.
    const double by_sigma[][3] = {{1, 0.3173105078629, 3.526740380262},
                                  {2, 0.04550026389636, 8.024881760266},
                                  {3, 0.00269979606326, 14.15641360913},
                                  {4, 6.334248366624e-05, 22.06132063696},
                                  {5, 5.733031437584e-07, 31.8121083486}};
    for (const auto& [sigma, p, x] : by_sigma) {
        CHECK(exceedance_of_chi_square(x, 3.0) == Approx(p).epsilon(1e-10));
        CHECK(sigma_of_chi_square(x, 3.0) == Approx(sigma).epsilon(1e-10));
        CHECK(sigma_of_probability(p) == Approx(sigma).epsilon(1e-10));
    }
    const double by_x[][3] = {{1, 0.8012519569012, 0.2517271668715},
                              {3, 0.3916251762711, 0.8566738191736},
                              {9, 0.02929088653489, 2.179549299205},
                              {25, 1.54404982911e-05, 4.322308645001}};
    for (const auto& [x, p, sigma] : by_x) {
        CHECK(exceedance_of_chi_square(x, 3.0) == Approx(p).epsilon(1e-11));
        CHECK(sigma_of_chi_square(x, 3.0) == Approx(sigma).epsilon(1e-11));
    }
}

TEST_CASE("levels at the ends", "[summary]") {
    CHECK(sigma_of_probability(1.0) == 0.0);
    CHECK(std::isinf(sigma_of_probability(0.0)));
    CHECK(exceedance_of_chi_square(0.0, 3.0) == 1.0);
    CHECK(exceedance_of_chi_square(std::numeric_limits<double>::infinity(), 3.0) == 0.0);
    CHECK(std::isnan(exceedance_of_chi_square(NAN, 3.0)));
    CHECK(std::isnan(sigma_of_chi_square(NAN, 3.0)));
}

TEST_CASE("levels beyond the range of a double go on smoothly", "[summary]") {
    // For two degrees of freedom p = exp(-x/2) exactly; where that underflows, the level must
    // continue the one before. At x = 1370 (p = 3e-298) both ways are open.
    const double before = sigma_of_chi_square(1370.0, 2.0);
    const double after = sigma_of_chi_square(1390.0, 2.0);
    CHECK(before == Approx(sigma_of_probability(std::exp(-685.0))).epsilon(1e-12));
    CHECK(after - before == Approx(10.0 / before).epsilon(0.03));
    // sigma^2 = x - 2 ln sigma - ln(pi/2) + …: 99.94 for x = 10^4.
    CHECK(sigma_of_chi_square(1e4, 2.0) ==
          Approx(std::sqrt(1e4 - 2.0 * std::log(99.95) - std::log(std::acos(-1.0) / 2.0)))
              .epsilon(1e-4));
}
