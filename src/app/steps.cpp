// SPDX-License-Identifier: GPL-2.0-or-later
#include "app/steps.h"

#include <fmt/chrono.h>
#include <fmt/format.h>

#include <algorithm>
#include <chrono>
#include <utility>

#include "app/interrupt.h"
#include "deviascope/chain/chain_file.h"
#include "deviascope/core/error.h"
#include "deviascope/core/grouped_number.h"
#include "deviascope/core/version.h"
#include "deviascope/counts/count_sources.h"
#include "deviascope/counts/moments.h"
#include "deviascope/model/forecast.h"

namespace deviascope {

namespace fs = std::filesystem;

namespace {

constexpr const char* cmb_prior_name = "cmb-velocity";

/// The prior that `offset_from_cmb` refers to: the job's own copy, else the library's.
Companion cmb_prior(const std::vector<Companion>& companions, const fs::path& folder) {
    const auto own = std::find_if(companions.begin(), companions.end(), [](const Companion& c) {
        return c.name == cmb_prior_name;
    });
    if (own != companions.end()) return *own;
    if (const auto found = find_prior(cmb_prior_name, folder)) return *found;
    throw UsageError({cmb_prior_name,
                      "the prior file is not found",
                      "the program's own priors folder holds it",
                      "reinstall the program, or put cmb-velocity.toml beside the job"});
}

Eigen::Vector3d cmb_velocity(const Companion& companion, Frame frame) {
    const VectorPrior prior = parse_prior(companion, frame);
    const auto* gaussian = std::get_if<GaussianPrior>(&prior.kind());
    if (gaussian != nullptr) return gaussian->mean;
    throw UsageError({companion.path,
                      fmt::format("is of kind {}", prior.kind_name()),
                      "the reference for offsets must be a measured-velocity or gaussian prior",
                      ""});
}

[[noreturn]] void refuse_counts(const fs::path& counts, Existing existing) {
    const Message message{counts.string(),
                          "was made from other inputs or cuts",
                          "counts are used again only for the same inputs and cuts",
                          "give --replace to count anew, or another folder with -o"};
    if (existing == Existing::keep) throw UsageError(message);
    throw OutputError(message);
}

bool has_empty_bin(const Counts& counts) {
    for (const SurveyCounts& survey : counts.surveys)
        for (const BinCounts& bin : survey.bins)
            if (bin.total() == 0) return true;
    return false;
}

Job job_of(const Chain& chain) {
    const auto finder = [&](const std::string& name) -> std::optional<Companion> {
        for (const Companion& companion : chain.provenance.companions)
            if (companion.name == name) return companion;
        return std::nullopt;
    };
    return parse_job(chain.provenance.job_text, chain.provenance.job_name, finder);
}

}  // namespace

Progress ending_on_request(Progress show) {
    return [show = std::move(show)](const std::string& line) {
        if (interrupt_requested()) throw Interrupted();
        if (show) show(line);
    };
}

std::string time_now() {
    const std::time_t now =
        std::chrono::system_clock::to_time_t(std::chrono::system_clock::now());
    return fmt::format("{:%Y-%m-%dT%H:%M:%SZ}", fmt::gmtime(now));
}

Provenance provenance_of(const Job& job, const InputRecord& inputs) {
    Provenance provenance;
    provenance.job_name = job.name;
    provenance.job_text = job.text;
    provenance.companions = job.companions;
    const Companion reference = cmb_prior(job.companions, job.folder);
    const bool known = std::any_of(job.companions.begin(),
                                   job.companions.end(),
                                   [](const Companion& c) { return c.name == cmb_prior_name; });
    if (!known) provenance.companions.push_back(reference);
    provenance.inputs = inputs.files;
    provenance.version = version();
    provenance.seed = job.seed;
    provenance.started = time_now();
    return provenance;
}

InputRecord record_inputs(const Job& job, Terminal& terminal) {
    for (const std::string& warning : job.warnings) terminal.warn(warning);
    InputRecord record;
    record.files = digests_of_inputs(job, ending_on_request(terminal.progress()));
    record.counts_digest = digest_of_inputs(job, record.files);
    return record;
}

Counts count_surveys(const Job& job, Terminal& terminal) {
    Counts counts;
    counts.nside = job.nside;
    counts.frame = job.frame;
    const Pixelisation grid(job.nside);
    for (const SurveyInput& survey : job.surveys) {
        counts.surveys.push_back(
            count_survey(survey, grid, job.frame, ending_on_request(terminal.progress())));
        const SurveyCounts& counted = counts.surveys.back();
        terminal.say(fmt::format("Counted {}: {} of {} rows and {} of {} pixels kept.",
                                 counted.name,
                                 grouped(counted.cuts.rows_kept),
                                 grouped(counted.cuts.rows_read),
                                 grouped(counted.cuts.pixels_kept),
                                 grouped(counted.cuts.pixels_total)));
    }
    return counts;
}

std::size_t warn_of_counts(const Counts& counts, Terminal& terminal) {
    std::size_t n = 0;
    for (const SurveyCounts& survey : counts.surveys) {
        for (const std::string& warning : survey.cuts.warnings) {
            terminal.warn(fmt::format("{}: {}", survey.name, warning));
            ++n;
        }
    }
    return n;
}

std::size_t warn_of_counts_and_priors(const Counts& counts,
                                      const ParameterSpace& space,
                                      Terminal& terminal) {
    std::vector<std::string> warnings;
    const auto forecasts =
        has_empty_bin(counts) ? std::vector<VectorForecast>{} : forecast(counts, space);
    for (const VectorForecast& vector : forecasts)
        if (vector.prior_rules)
            warnings.push_back(
                fmt::format("{}: its prior (sd {:.2g} a component) is narrower than the noise "
                            "of the counts "
                            "(sd {:.2g} without it): the result will be mostly the prior",
                            vector.name,
                            vector.prior_sd,
                            vector.counts_sd));
    const std::size_t n = warn_of_counts(counts, terminal);
    for (const std::string& warning : warnings) terminal.warn(warning);
    return n + warnings.size();
}

CountsFile make_counts(const Job& job,
                       const InputRecord& inputs,
                       const fs::path& folder,
                       Terminal& terminal) {
    CountsFile file{count_surveys(job, terminal), inputs.counts_digest, version()};
    if (job.is_unmeasured())
        warn_of_counts(file.counts, terminal);
    else
        warn_of_counts_and_priors(
            file.counts, ParameterSpace(file.counts, job.model), terminal);
    add_moments(file.counts);
    write_counts(folder / "counts.h5", file);
    return file;
}

CountsFile obtain_counts(const Job& job,
                         const InputRecord& inputs,
                         const fs::path& folder,
                         Existing existing,
                         Terminal& terminal) {
    const fs::path path = folder / "counts.h5";
    if (fs::exists(path)) {
        CountsFile file = read_counts(path);
        if (file.digest == inputs.counts_digest) {
            terminal.say(
                fmt::format("Counts taken from {}: its inputs are unchanged.", path.string()));
            return file;
        }
        if (existing != Existing::replace) refuse_counts(path, existing);
    }
    return make_counts(job, inputs, folder, terminal);
}

Summary summarise_into(const Chain& chain,
                       const fs::path& folder,
                       int threads,
                       Terminal& terminal) {
    const Job job = job_of(chain);
    SummaryOptions options;
    options.title = job.title;
    options.seed = job.seed;
    options.cmb_velocity =
        cmb_velocity(cmb_prior(chain.provenance.companions, folder), job.frame);
    options.job_warnings = job.warnings;
    options.threads = threads;
    options.effective_draws_wanted = job.ensemble.effective_draws;
    const ParameterSpace space(chain.counts, job.model);
    Summary summary = summarise(chain, space, options);
    write_text(folder / "summary.json", to_json(summary));
    const std::string text = to_text(summary);
    write_text(folder / "summary.txt", text);
    terminal.say(text);
    terminal.say(fmt::format("Written: {} and summary.json beside it.",
                             (folder / "summary.txt").string()));
    return summary;
}

}  // namespace deviascope
