// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/sky/boost.h"

#include <catch2/catch.hpp>
#include <cmath>
#include <vector>

#include "deviascope/core/physical_constants.h"

using namespace deviascope;

namespace {

constexpr double digits15 = 3e-15;  // the tables below have 15 digits

}  // namespace

TEST_CASE("aberration and Doppler factor follow the exact relations", "[sky]") {
    // mu' = (mu + beta)/(1 + beta mu), delta = gamma (1 + beta mu) of special relativity,
    // evaluated with 40 digits (mpmath) and rounded to 15.
    struct Row {
        double beta, theta_deg, cosine, delta;
    };
    const std::vector<Row> rows = {
        {0.01, 0, 1, 1.01005050378782},
        {0.01, 30, 0.868503939039488, 1.00871069083334},
        {0.01, 60, 0.507462686567164, 1.00505025376906},
        {0.01, 90, 0.01, 1.00005000375031},
        {0.01, 120, -0.492462311557789, 0.995049753731561},
        {0.01, 180, -1, 0.990049503712809},
        {0.1, 0, 1, 1.10554159678513},
        {0.1, 30, 0.88903289647012, 1.09207664323706},
        {0.1, 60, 0.571428571428571, 1.05528970602217},
        {0.1, 90, 0.1, 1.00503781525921},
        {0.1, 120, -0.421052631578947, 0.954785924496251},
        {0.1, 180, -1, 0.904534033733291},
    };
    for (const Row& row : rows) {
        CAPTURE(row.beta, row.theta_deg);
        const double theta = row.theta_deg * radians_per_degree;
        const Direction n(std::sin(theta), 0.0, std::cos(theta));
        const Boost boost(Eigen::Vector3d(0.0, 0.0, row.beta));
        const Direction seen = boost.aberrated(n);
        CHECK(std::abs(seen.z() - row.cosine) < digits15);
        CHECK(std::abs(seen.norm() - 1.0) < digits15);
        CHECK(seen.y() == 0.0);
        CHECK(std::abs(boost.doppler_factor(n) - row.delta) < 2.0 * digits15);
    }
}

TEST_CASE("the boosted properties of one source have 14 digits", "[sky]") {
    // Source at 60 deg from the boost; S delta^(1+alpha), m - 2.5 (1+alpha) log10 delta,
    // (1+z)/delta, s/delta, evaluated with 40 digits (mpmath).
    struct Row {
        double beta, x, z, flux, magnitude, bolometric, redshift, size;
    };
    const std::vector<Row> rows = {{0.01,
                                    0.861673732767824,
                                    0.507462686567164,
                                    10.088546747605,
                                    19.9904284731469,
                                    19.9890611121679,
                                    0.989950246268532,
                                    1.98995024626853},
                                   {0.1,
                                    0.82065180664829,
                                    0.571428571428571,
                                    10.987540226971,
                                    19.8977488047512,
                                    19.8831414911442,
                                    0.895214165917371,
                                    1.89521416591737}};
    const Direction n(std::sqrt(3.0) / 2.0, 0.0, 0.5);
    for (const Row& row : rows) {
        const Boost boost(Eigen::Vector3d(0.0, 0.0, row.beta));
        const Direction seen = boost.aberrated(n);
        const double delta = boost.doppler_factor(n);
        CHECK(std::abs(seen.x() - row.x) < digits15);
        CHECK(std::abs(seen.z() - row.z) < digits15);
        CHECK(std::abs(boosted_flux(10.0, 0.75, delta) - row.flux) < 1e-12);
        CHECK(std::abs(boosted_magnitude(20.0, 0.75, delta) - row.magnitude) < 1e-13);
        CHECK(std::abs(boosted_magnitude(20.0, 1.0, delta) - row.bolometric) < 1e-13);
        CHECK(std::abs(boosted_redshift(1.0, delta) - row.redshift) < digits15);
        CHECK(std::abs(boosted_size(2.0, delta) - row.size) < digits15);
    }
}

TEST_CASE("a boost undone leaves the source where it was", "[sky]") {
    for (const double beta : {0.0, 1e-9, 1.2e-3, 0.5, 0.99}) {
        const Eigen::Vector3d velocity = beta * Direction(2.0, -1.0, 2.0).normalized();
        const Boost boost(velocity);
        const Boost back(-velocity);
        for (const Direction& n :
             {Direction(1, 0, 0), Direction(0, 0, -1), Direction(0.6, -0.48, 0.64)}) {
            const Direction seen = boost.aberrated(n);
            // The way back through a delta near 0 loses digits by the same factor.
            const double tolerance = 4e-16 * std::pow(boost.gamma(), 4);
            CHECK((back.aberrated(seen) - n).norm() <= std::max(tolerance, 1e-15));
            CHECK(boost.doppler_factor(n) * back.doppler_factor(seen) ==
                  Approx(1.0).epsilon(std::max(tolerance, 1e-15)));
        }
        if (beta == 0.0) CHECK(boost.aberrated(Direction(0, 1, 0)) == Direction(0, 1, 0));
    }
}
