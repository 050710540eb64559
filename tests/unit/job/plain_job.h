// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <optional>
#include <stdexcept>
#include <string>

#include "deviascope/core/error.h"
#include "deviascope/job/job.h"

namespace deviascope {

/// A short job without faults; its lines are numbered from 1.
inline const std::string plain_job = R"([job]
seed = 1
nside = 64
[velocity]
prior = { kind = "uniform-vector", max = 0.05 }
[intrinsic]
prior = { kind = "gaussian", sd = 0.01 }
[[survey]]
name = "dunlin"
catalogue = "dunlin.fits"
frame = "icrs"
columns = { lon = "RA", lat = "DEC", flux = "S", redshift = "Z" }
[[survey.bin]]
name = "faint"
select = { flux = [10.0, 20.0] }
weight = { mean = 3.75, sd = 0.05 }
[[survey.bin]]
name = "bright"
select = { flux = [20.0, inf] }
weight = { mean = 4.0, sd = 0.05 }
)";

/// A text with its first `from` turned into `to`.
inline std::string with(std::string text, const std::string& from, const std::string& to) {
    const auto at = text.find(from);
    if (at == std::string::npos) throw std::logic_error("not in the text: " + from);
    return text.replace(at, from.size(), to);
}

/// Finds only what the program ships.
inline std::optional<Companion> shipped(const std::string& name) {
    return find_prior(name, DEVIASCOPE_SOURCE_FOLDER "/priors");
}

inline Job parsed(const std::string& text, const CompanionFinder& finder = shipped) {
    return parse_job(text, "j.toml", finder);
}

/// All faults of a job's text, one a line; empty where there is none.
inline std::string faults_of(const std::string& text, const CompanionFinder& finder = shipped) {
    try {
        parsed(text, finder);
    } catch (const UsageError& error) {
        return error.what();
    }
    return "";
}

}  // namespace deviascope
