// SPDX-License-Identifier: GPL-2.0-or-later
// ensemble -> CHAIN -> summary
#pragma once

#include <cstdint>
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
    /// Names and versions of the libraries and compiler the bits depend on; where empty, the
    /// writer stores library_versions().
    std::string libraries;
    std::uint64_t seed = 0;      ///< 0 … 2^63-1
    std::string started, ended;  ///< UTC, ISO 8601; ended empty while running
};

/// Names and versions of HDF5, Boost, Eigen and the compiler, on one line.
std::string library_versions();

/// What chains.h5 holds. A file that is still being written, or whose run was cut off, reads as
/// far as it was stored: `outcome.end` is then `not_run` and `provenance.ended` empty.
struct Chain {
    Provenance provenance;
    /// As the run was started. Threads, progress and stop request are not stored: they change
    /// no bit. The seed is the provenance's.
    EnsembleOptions options;
    std::vector<Parameter> parameters;
    std::vector<VectorParameter> vectors;
    Counts counts;        ///< what was fitted, embedded so that one file is enough
    WarmUp warm_up;       ///< store_every and discarded are needed to go on
    Draws draws;          ///< no rows before the first block
    EnsembleState state;  ///< after the last stored row; without coordinates before it
    Outcome outcome;
};

}  // namespace deviascope
