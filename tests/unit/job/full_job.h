// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <optional>
#include <string>

#include "plain_job.h"

namespace deviascope {

/// Every key of the schema once, as the README shows it.
inline const std::string full_job = R"toml([job]
title = "Dunlin and Lantern, joint"
seed = 20260817             # 0 … 2^63-1
nside = 64                  # power of two, 1…1024
frame = "galactic"
deduplicate = [ "dunlin over lantern" ]

[velocity]
prior = "free-velocity"

[intrinsic]
shared = false
prior = { kind = "gaussian", sd = 0.01 }

[monopole]
prior = { kind = "log-uniform" }
sample = false

[ensemble]
engine = "auto"
tolerance = 1e-6
replicates = 4
walkers = 144
effective_draws = 10000
max_steps = 200000
store_every = 0
kernels = { stretch = 0.2, differential-evolution = 0.3, independence = 0.5 }

[[survey]]
name = "dunlin"
catalogue = ["dunlin-north.fits", "dunlin-south.fits"]
table = "SOURCES"
frame = "icrs"
columns = { lon = "RA", lat = "DEC", flux = "S", alpha = "ALPHA", redshift = "Z", magnitude = "MAG", size = "THETA", colour = "W12" }
alpha = { mean = 0.75, sd = 0.2 }
scatter = { redshift = "0.05*(1+z)", flux = 0.1 }
exposure = "dunlin-exposure.fits"
map_frame = "galactic"
exclude = [ { band = 15.0, frame = "galactic" }, { lon = 83.6, lat = 22.0, radius = 1.5, frame = "icrs" }, { below = -40.0, frame = "icrs" } ]
select = { flux = [10.0, inf] }
weights = "dunlin-weights.toml"
bad_rows = "stop"
prior = { kind = "gaussian", sd = 0.02 }

[[survey.bin]]
name = "faint"
select = { flux = [10.0, 20.0] }
weight = { mean = 3.75, sd = 0.05 }
bias = 1.0
dispersion = 1.0
exposure = "dunlin-faint-exposure.fits"

[[survey.bin]]
name = "bright"
counts = "dunlin-bright-counts.fits"
weight = { x = 1.1, x_sd = 0.05, alpha = 0.75, alpha_sd = 0.05 }

[[hypothesis]]
name = "cmb-velocity-only"
velocity = { prior = "cmb-velocity" }
intrinsic = { prior = "no-intrinsic" }
)toml";

inline const std::string dunlin_weights = R"(survey = "dunlin"
covariance = [[0.0025, 0.001], [0.001, 0.0016]]
[[bin]]
name = "bright"
mean = 3.9
[[bin]]
name = "faint"
mean = 3.7
sd = 0.04
)";

/// The full job, alone: without the survey it is to be deduplicated over, and with other
/// kernels than the default.
inline std::string available_job() {
    std::string job = with(full_job, "deduplicate = [ \"dunlin over lantern\" ]\n", "");
    return with(job,
                "{ stretch = 0.2, differential-evolution = 0.3, independence = 0.5 }",
                "{ stretch = 0.25, differential-evolution = 0.75 }");
}

inline std::optional<Companion> with_weights(const std::string& name) {
    if (name == "dunlin-weights.toml") return Companion{name, name, dunlin_weights};
    return shipped(name);
}

}  // namespace deviascope
