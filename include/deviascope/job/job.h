// SPDX-License-Identifier: GPL-2.0-or-later
// JOB: TOML to the options of the stages
#pragma once

#include <filesystem>
#include <functional>
#include <optional>
#include <string>
#include <vector>

#include "deviascope/chain/chain.h"
#include "deviascope/counts/survey_input.h"
#include "deviascope/ensemble/options.h"
#include "deviascope/model/model_options.h"
#include "deviascope/weights/measure_weights.h"

namespace deviascope {

/// A data file that a job reads: a catalogue, an exposure map or a count map.
struct InputFile {
    std::string written;         ///< as the job file names it
    std::filesystem::path path;  ///< where it is: relative paths start at the job's folder
};

/// What a job says about measuring the weights of a survey.
struct SurveyWeighing {
    SourcePhysics physics;
    std::vector<std::size_t> bins;  ///< that are measured, or could be
    bool asked_for = false;         ///< weights = "measure"
    /// Asked for, and not there yet: the weights of `bins` in the model are NaN.
    bool unmeasured = false;
};

/// A rival hypothesis: priors in place of the job's; what is empty stays as it is.
struct Hypothesis {
    std::string name;
    std::optional<VectorPrior> velocity;
    std::optional<VectorPrior> intrinsic;  ///< of every survey, or of all where shared
    bool intrinsic_shared = false;         ///< with `intrinsic` only
};

/// Sources of `second` that lie where one of `first` does are not counted; places in
/// `Job::surveys`.
struct Deduplication {
    std::size_t first = 0, second = 0;
};

/// A bin of a survey, as their places in the job.
struct BinPlace {
    std::size_t survey = 0, bin = 0;
};

/// A job file, understood: the options of every stage. Paths in `surveys` are those of
/// `inputs`.
struct Job {
    std::string name;              ///< file name
    std::string title;             ///< job.title, else the file name
    std::filesystem::path folder;  ///< where relative paths start; empty for a text
    std::string text;              ///< the file's bytes
    std::uint64_t seed = 0;
    int nside = 64;
    Frame frame = Frame::galactic;
    std::vector<SurveyInput> surveys;
    std::vector<SurveyWeighing> weighing;  ///< of each survey
    ModelOptions model;
    EnsembleOptions ensemble;  ///< threads, stop and progress are the command's to fill
    std::vector<Hypothesis> hypotheses;
    std::vector<Deduplication> deduplicate;  ///< no survey depends on itself, however long the
                                             ///< way round
    double match_arcsec = 5.0;
    /// Bins whose dispersion is to be measured from their counts; 1 until then.
    std::vector<BinPlace> measure_dispersion;
    std::vector<InputFile> inputs;      ///< each file once, in job order
    std::vector<Companion> companions;  ///< priors and weights files that were read
    std::vector<std::string> warnings;  ///< for instance bins that share one alpha

    /// Whether weights are still to be measured before the model is complete.
    bool is_unmeasured() const;
};

/// Finds the text of a prior (by name) or weights file (by path as written); empty where there
/// is none. The default searches the disk (README, "Priors"); a chain answers from what it
/// keeps.
using CompanionFinder = std::function<std::optional<Companion>(const std::string& name)>;

/// Reads a job file and checks every rule of the schema, and that every input file exists.
/// Errors: UsageError with *all* faults, each `path:line:column: key: found; allowed; remedy`.
Job read_job(const std::filesystem::path& path);

/// The same for measuring weights alone: bins need none, and a weights file need not be there.
Job read_job_to_weigh(const std::filesystem::path& path);

/// A job that was read, with the weights it asked to be measured.
/// @param measured  texts of weights files, one for each such survey, under the names that
///                  `name_of_measured_weights` gives
Job completed(const Job& job, const std::vector<Companion>& measured);

/// How a chain calls the measured weights of a survey among its companions.
std::string name_of_measured_weights(const std::string& survey);

/// The text of a weights file, with everything that was found out.
/// @param digest  see `digest_of_weighing`
std::string weights_file_text(const MeasuredWeights& weights, const std::string& digest);

/// The digest that a measured weights file carries; empty where it carries none.
/// Errors: UsageError where the text is no weights file.
std::string digest_in_weights_file(const Companion& file);
/// The same from a text that stands for the file of that path.
Job read_job(const std::filesystem::path& path, const std::string& text);

/// The same from a text, without looking for input files: for chains that are read back.
/// @param name        of the job, as faults shall call it
/// @param companions  answers with `Job::companions` of the job that was read, by name
Job parse_job(const std::string& text,
              const std::string& name,
              const CompanionFinder& companions);

/// The priors of the published library, by name, from where `read_job` would find them.
std::optional<Companion> find_prior(const std::string& name,
                                    const std::filesystem::path& job_folder);

/// A prior file's text as a prior in the job's frame. Errors: UsageError.
VectorPrior parse_prior(const Companion& companion, Frame job_frame);

/// SHA-256 over everything that decides the counts (nside, frame, surveys without weights and
/// priors), for counts.h5. Files count by their bytes, not by their names.
/// @param inputs  one for each of `Job::inputs`, in their order
std::string digest_of_inputs(const Job& job, const std::vector<InputDigest>& inputs);

/// SHA-256 over everything that decides the measured weights of a survey: what decides its
/// counts, spectral index and scatter, the bins measured, the seed and the version.
std::string digest_of_weighing(const Job& job,
                               std::size_t survey,
                               const std::vector<InputDigest>& inputs);

/// Digests of all input files of a job, in the order of `Job::inputs`.
/// Errors: InputError if one cannot be read; what `progress` throws.
std::vector<InputDigest> digests_of_inputs(const Job& job, const Progress& progress = {});

}  // namespace deviascope
