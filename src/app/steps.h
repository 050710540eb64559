// SPDX-License-Identifier: GPL-2.0-or-later
// APP: on top of all stages
#pragma once

#include <filesystem>

#include "app/output_folder.h"
#include "app/terminal.h"
#include "deviascope/chain/chain.h"
#include "deviascope/counts/counts_file.h"
#include "deviascope/job/job.h"
#include "deviascope/model/parameter_space.h"
#include "deviascope/sky/direction.h"
#include "deviascope/summary/summary.h"

namespace deviascope {

/// The arrows of the flow, as commands share them. Each says what it did in a few plain lines.

/// A job's inputs: digests of every file, and the digest that its counts carry.
struct InputRecord {
    std::vector<InputDigest> files;
    std::string counts_digest;
};
/// Errors: Interrupted while files are read.
InputRecord record_inputs(const Job& job, Terminal& terminal);

/// Readers of long files ask nobody whether to go on; where they tell how far they are, a
/// request to end can be heard: the progress throws Interrupted.
Progress ending_on_request(Progress show);

/// Positions of the sources of each survey that are counted, in the job's frame.
using KeptPositions = std::vector<std::vector<Direction>>;

/// catalogue -> counts: counts every survey, those that others give way to first; writes
/// nothing. Errors: Interrupted while catalogues are read.
/// @param kept  takes the positions of what is counted; null: they are not kept
Counts count_surveys(const Job& job, Terminal& terminal, KeptPositions* kept = nullptr);

/// counts -> model: measures the dispersions that the job asks for from the counts, and puts
/// them in force (README, "Dispersion").
void measure_dispersions(Job& job, const Counts& counts, Terminal& terminal);

/// A prior by its name: the job's own copy, else the library's. Errors: UsageError.
VectorPrior prior_of(const std::string& name,
                     const std::vector<Companion>& companions,
                     const std::filesystem::path& folder,
                     Frame frame);

/// The same, as a Gaussian to compare velocities with.
/// Errors: UsageError (no such prior; another kind).
GaussianPrior reference_velocity(const std::string& name,
                                 const std::vector<Companion>& companions,
                                 const std::filesystem::path& folder,
                                 Frame frame);

/// What is suspicious about the inputs; returns how many warnings it gave.
std::size_t warn_of_counts(const Counts& counts, Terminal& terminal);

/// The same, and vectors whose prior is narrower than the noise of the counts.
std::size_t warn_of_counts_and_priors(const Counts& counts,
                                      const ParameterSpace& space,
                                      Terminal& terminal);

/// catalogue -> counts: counts every survey, warns, and writes counts.h5.
/// Errors: Interrupted while catalogues are read.
CountsFile make_counts(const Job& job,
                       const InputRecord& inputs,
                       const std::filesystem::path& folder,
                       Terminal& terminal);

/// The counts.h5 of the folder where it fits the job's inputs; made where there is none.
/// Errors: where one is there that does not fit, and is not to be replaced: OutputError, or
/// UsageError where it was to be kept.
CountsFile obtain_counts(const Job& job,
                         const InputRecord& inputs,
                         const std::filesystem::path& folder,
                         Existing existing,
                         Terminal& terminal);

/// UTC, ISO 8601.
std::string time_now();

/// Where a chain of this job comes from, begun now.
Provenance provenance_of(const Job& job, const InputRecord& inputs);

/// A chain's summary, and what of its job later stages need.
struct Summarised {
    ParameterSpace space;
    Eigen::Vector3d cmb_velocity;  ///< of the cmb-velocity prior, job's frame, units of c
    Summary summary;
};
/// chain -> summary; writes nothing.
/// @param folder  where the cmb-velocity prior is looked for if the chain does not hold it
Summarised summarised(const Chain& chain, const std::filesystem::path& folder, int threads);

/// chain -> summary: writes summary.json and summary.txt of a chain into the folder.
Summarised summarise_into(const Chain& chain,
                          const std::filesystem::path& folder,
                          int threads,
                          Terminal& terminal);

}  // namespace deviascope
