// SPDX-License-Identifier: GPL-2.0-or-later
// A small job on one survey that needs no random numbers.
#pragma once

#include <cmath>
#include <string>

namespace deviascope::test {

/// A small survey; `weights` are its bins, from `bins`, and `ensemble` the keys of [ensemble].
inline std::string small_job(const std::string& weights, const std::string& ensemble) {
    return "[job]\nseed = 20260817\nnside = 8\nframe = \"icrs\"\n"
           "[velocity]\nprior = \"free-velocity\"\n"
           "[intrinsic]\nprior = { kind = \"gaussian\", sd = 0.05 }\n"
           "[ensemble]\n" +
           ensemble +
           "[[survey]]\nname = \"binnacle\"\ncatalogue = \"binnacle.csv\"\nframe = \"icrs\"\n"
           "columns = { lon = \"ra\", lat = \"dec\", flux = \"s\" }\n" +
           weights;
}

/// Two bins in flux, with these kinematic weights.
inline std::string bins(double faint, double bright) {
    const auto bin = [](const char* name, const char* range, double weight) {
        return std::string("[[survey.bin]]\nname = \"") + name +
               "\"\nselect = { flux = " + range +
               " }\nweight = { mean = " + std::to_string(weight) + ", sd = 0.0 }\n";
    };
    return bin("faint", "[1.0, 2.0]", faint) + bin("bright", "[2.0, inf]", bright);
}

/// A catalogue of positions on a lattice of golden-ratio steps: no random numbers, nearly
/// isotropic.
inline std::string lattice_catalogue(int n) {
    std::string text = "ra,dec,s\n";
    for (int k = 0; k < n; ++k) {
        const double z = (2.0 * k + 1.0) / n - 1.0;
        const double turn = k * 0.6180339887498949;
        const double lon = 360.0 * (turn - std::floor(turn));
        text += std::to_string(lon) + ',' + std::to_string(std::asin(z) * 57.29577951308232) +
                ',' + (k % 2 == 0 ? "1.5" : "3.0") + '\n';
    }
    return text;
}

}  // namespace deviascope::test
