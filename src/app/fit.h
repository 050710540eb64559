// SPDX-License-Identifier: GPL-2.0-or-later
// APP: on top of all stages
#pragma once

#include <memory>
#include <string>
#include <vector>

#include "app/commands.h"
#include "app/terminal.h"
#include "deviascope/ensemble/sampler.h"
#include "deviascope/job/job.h"
#include "deviascope/model/posterior.h"
#include "deviascope/summary/evidence.h"
#include "deviascope/summary/interval.h"

namespace deviascope {

/// A posterior and its draws, in memory.
struct Fit {
    std::string name;
    std::shared_ptr<const Counts> counts;
    std::unique_ptr<Posterior> posterior;
    Outcome outcome;
    Draws draws;
    CoordinateDraws coordinates;
    std::uint64_t seed = 0;

    bool converged() const { return outcome.end == Outcome::End::converged; }
    Eigen::Index n_draws() const { return std::ssize(draws.log_posterior); }
    /// All draws of a vector: 3 x draws.
    Eigen::Matrix3Xd vector(std::size_t index) const;
    /// Its length.
    ScalarEstimate amplitude(std::size_t index) const;
    /// All parameters: n_parameters x draws.
    Eigen::MatrixXd parameters() const;
    /// Independent draws of the velocity: the fewest of its components.
    double effective_velocities() const;
};

/// Samples one posterior after another, each with a seed of its own that follows from the
/// job's and the order of the fits.
class Fitter {
  public:
    Fitter(const Job& job, const CommandOptions& options, Terminal& terminal)
        : job_(job), options_(options), terminal_(terminal) {}

    /// @param effective_draws  wanted; never more than the job's
    /// Errors: as `sample`; Interrupted where a request to end came.
    Fit fit(std::string name,
            std::shared_ptr<const Counts> counts,
            const ModelOptions& model,
            double effective_draws = 10000);

    /// The evidence from a fit's draws.
    Evidence evidence(const Fit& fit) const;
    EvidenceOptions evidence_options(const Fit& fit) const;

    /// What the fits so far warned of, each with the name of its fit.
    const std::vector<std::string>& warnings() const { return warnings_; }

  private:
    const Job& job_;
    const CommandOptions& options_;
    Terminal& terminal_;
    std::uint64_t n_fits_ = 0;
    std::vector<std::string> warnings_;
};

/// Counts and model of some of the surveys, in the order given.
std::shared_ptr<const Counts> counts_of(const Counts& counts,
                                        const std::vector<std::size_t>& surveys);
ModelOptions model_of(const ModelOptions& model, const std::vector<std::size_t>& surveys);

}  // namespace deviascope
