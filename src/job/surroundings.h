// SPDX-License-Identifier: GPL-2.0-or-later
// JOB: TOML to the options of the stages
#pragma once

#include <filesystem>
#include <functional>
#include <optional>
#include <string>
#include <vector>

#include "deviascope/job/job.h"
#include "job/toml_reader.h"

namespace deviascope {

/// What a job's text refers to outside itself, and where that is found: on the disk, or among
/// the texts that a chain keeps.
class Surroundings {
  public:
    /// The disk, seen from the job's folder.
    /// @param measured  weights files that were measured for the job
    static Surroundings on_disk(const std::filesystem::path& folder,
                                const std::vector<Companion>& measured = {});
    /// Kept texts; data files are not looked for.
    static Surroundings kept(const CompanionFinder& companions);

    /// The prior that a key gives by name or as an inline table.
    std::optional<VectorPrior> read_prior(const TomlTable& table,
                                          const std::string& key,
                                          Frame job_frame,
                                          Presence presence);
    /// The text of a weights file that a key names.
    std::optional<Companion> read_companion(const TomlTable& table, const std::string& key);
    /// The measured weights of a survey, where they are known.
    std::optional<Companion> measured_weights(const std::string& survey);
    /// From now on weights are of no concern: none is required, and files need not be there.
    void pass_over_weights() { needs_weights_ = false; }
    bool needs_weights() const { return needs_weights_; }
    /// The path of a data file that a key names; a fault of that key where it is not there.
    std::filesystem::path input(const TomlTable& table,
                                const std::string& key,
                                const std::string& written);
    /// The same for a key that is one optional path.
    std::optional<std::filesystem::path> optional_input(const TomlTable& table,
                                                        const std::string& key);

    /// Texts and files met so far, each once, in the order of meeting.
    const std::vector<Companion>& companions() const { return companions_; }
    const std::vector<InputFile>& inputs() const { return inputs_; }

  private:
    Surroundings() = default;
    std::optional<VectorPrior> named_prior(const TomlTable& table,
                                           const std::string& key,
                                           Frame job_frame);
    void keep(const Companion& companion);
    std::filesystem::path resolved(const std::string& written) const;

    std::filesystem::path folder_;
    bool look_for_inputs_ = false;
    bool needs_weights_ = true;
    CompanionFinder find_prior_;
    CompanionFinder find_file_;
    CompanionFinder find_measured_;
    std::function<std::vector<std::string>()> known_priors_;
    std::vector<Companion> companions_;
    std::vector<InputFile> inputs_;
};

}  // namespace deviascope
