// SPDX-License-Identifier: GPL-2.0-or-later
// chain -> SUMMARY -> figures
#pragma once

#include <cstdint>
#include <optional>
#include <string>
#include <vector>

#include "deviascope/sky/frame.h"
#include "deviascope/summary/consistency.h"
#include "deviascope/summary/interval.h"

namespace deviascope {

/// An intrinsic dipole in a row of a sweep.
struct SweptDipole {
    std::string name;  ///< survey, or `all`
    ScalarEstimate amplitude;
};

/// The job run again with one value changed.
struct SweepRow {
    std::string path, value;  ///< both empty in the first row: the job as it is
    std::int64_t sources = 0;
    double sky_fraction = 0.0;  ///< the largest of the surveys
    VelocityGaussian velocity;
    ScalarEstimate speed;            ///< units of c
    std::optional<LonLat> galactic;  ///< of the mean velocity
    std::vector<SweptDipole> intrinsic;
    /// Difference of the velocity from the job's own.
    GaussianDifference difference;
    bool converged = true;
};

struct Sweep {
    std::string job;  ///< title
    Frame frame = Frame::galactic;
    std::vector<SweepRow> rows;
    std::vector<std::string> warnings;
};

/// Difference of two fits of nested data: the fit of the part differs from that of the whole by
///   covariance C_part - C_whole
/// (Hausman 1978, Econometrica 46, 1251; Gratton & Challinor 2020, MNRAS 499, 3410; both from
/// memory), the smaller covariance being the whole's. NaN where their difference is not
/// positive definite: fits of the same data, or of such that are not parts of each other, have
/// no expected scatter to be measured in.
GaussianDifference nested_difference(const VelocityGaussian& one,
                                     const VelocityGaussian& other);

/// sweep.json (schema 1), sweep.csv and the table that is printed; README, "The sweep".
std::string to_json(const Sweep& sweep);
std::string to_csv(const Sweep& sweep);
std::string to_text(const Sweep& sweep);

}  // namespace deviascope
