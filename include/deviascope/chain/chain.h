// SPDX-License-Identifier: GPL-2.0-or-later
// ensemble -> CHAIN -> summary
#pragma once

#include <string>
#include <vector>

#include "deviascope/core/parameter.h"
#include "deviascope/counts/count_map.h"
#include "deviascope/ensemble/draws.h"
#include "deviascope/ensemble/sampler.h"

namespace deviascope {

/// One input of a run and its SHA-256.
struct InputDigest {
    std::string path;  ///< as the job file names it
    std::string sha256;
    std::int64_t bytes = 0;
};

/// A small text the job depends on (a prior or weights file), kept whole so that the chain file
/// alone tells what was done.
struct Companion {
    std::string name;  ///< as the job file names it: `free-velocity`, `dunlin-weights.toml`
    std::string path;  ///< where it was found
    std::string text;
};

/// Where a chain comes from.
struct Provenance {
    std::string job_name;  ///< file name of the job
    std::string job_text;
    std::vector<Companion> companions;
    std::vector<InputDigest> inputs;
    std::string version;  ///< of the program
    std::uint64_t seed = 0;
    std::string started, ended;  ///< UTC, ISO 8601; ended empty while running
};

/// What chains.h5 holds.
struct Chain {
    Provenance provenance;
    std::vector<Parameter> parameters;
    std::vector<VectorParameter> vectors;
    Counts counts;  ///< what was fitted, embedded so that one file is enough
    WarmUp warm_up;
    Draws draws;
    EnsembleState state;  ///< after the last stored row
    Outcome outcome;
};

}  // namespace deviascope
