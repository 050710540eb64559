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
#include "deviascope/job/dispersion_file.h"
#include "deviascope/model/forecast.h"
#include "deviascope/model/posterior.h"
#include "deviascope/sky/position_match.h"
#include "deviascope/summary/fit_check.h"

namespace deviascope {

namespace fs = std::filesystem;

namespace {

constexpr const char* cmb_prior_name = "cmb-velocity";

/// A prior by name: the job's own copy, else the library's.
Companion prior_named(const std::string& name,
                      const std::vector<Companion>& companions,
                      const fs::path& folder) {
    const auto own = std::ranges::find(companions, name, &Companion::name);
    if (own != companions.end()) return *own;
    if (const auto found = find_prior(name, folder)) return *found;
    throw UsageError({name,
                      "there is no prior of this name",
                      "a file beside the job or in its priors/, or one of the program's own",
                      "check the name, or put " + name + ".toml beside the job"});
}

/// Surveys in an order in which each comes after those it gives way to.
std::vector<std::size_t> order_of_counting(const Job& job) {
    std::vector<std::size_t> order;
    std::vector<bool> placed(job.surveys.size(), false);
    while (order.size() < job.surveys.size())
        for (std::size_t survey = 0; survey < placed.size(); ++survey) {
            const bool waits = std::ranges::any_of(job.deduplicate, [&](const auto& one) {
                return one.second == survey && !placed[one.first];
            });
            if (placed[survey] || waits) continue;
            placed[survey] = true;
            order.push_back(survey);
        }
    return order;
}

void say_what_was_counted(const SurveyCounts& counted, Terminal& terminal) {
    terminal.say(fmt::format("Counted {}: {} of {} rows and {} of {} pixels kept.",
                             counted.name,
                             grouped(counted.cuts.rows_kept),
                             grouped(counted.cuts.rows_read),
                             grouped(counted.cuts.pixels_kept),
                             grouped(counted.cuts.pixels_total)));
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
    Job job = parse_job(chain.provenance.job_text, chain.provenance.job_name, finder);
    if (const auto measured = finder(dispersion_file_name)) adopt_dispersion(job, *measured);
    return job;
}

/// Dispersions at the mode, one for each bin that asks.
std::vector<MeasuredDispersion> dispersions_at_mode(const Job& job, const Counts& counts) {
    const Posterior posterior(counts, job.model, job.seed);
    const auto checks = check_fit_at_mode(counts, posterior, job.seed);
    std::vector<MeasuredDispersion> measured;
    for (const BinPlace& place : job.measure_dispersion)
        for (std::size_t t = 0; t < checks.size(); ++t) {
            const BinTerm& term = posterior.space().terms()[t];
            if (term.survey == place.survey && term.bin == place.bin)
                measured.push_back(
                    {place, std::max(checks[t].dispersion, 1.0), checks[t].dispersion_sd});
        }
    return measured;
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
    const Companion reference = prior_named(cmb_prior_name, job.companions, job.folder);
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

Counts count_surveys(const Job& job, Terminal& terminal, KeptPositions* kept) {
    Counts counts;
    counts.nside = job.nside;
    counts.frame = job.frame;
    counts.surveys.resize(job.surveys.size());
    const Pixelisation grid(job.nside);
    KeptPositions positions(job.surveys.size());
    std::vector<std::optional<PositionIndex>> index(job.surveys.size());
    for (const std::size_t s : order_of_counting(job)) {
        std::vector<Duplicates> duplicates;
        for (const Deduplication& one : job.deduplicate)
            if (one.second == s)
                duplicates.push_back({job.surveys[one.first].name, &*index[one.first]});
        const bool is_first = std::ranges::any_of(
            job.deduplicate, [&](const Deduplication& one) { return one.first == s; });
        counts.surveys[s] = count_survey(job.surveys[s],
                                         grid,
                                         job.frame,
                                         ending_on_request(terminal.progress()),
                                         duplicates,
                                         is_first || kept ? &positions[s] : nullptr);
        if (is_first) index[s].emplace(positions[s], job.match_arcsec * radians_per_arcsec);
        say_what_was_counted(counts.surveys[s], terminal);
    }
    if (kept != nullptr) *kept = std::move(positions);
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

VectorPrior prior_of(const std::string& name,
                     const std::vector<Companion>& companions,
                     const fs::path& folder,
                     Frame frame) {
    return parse_prior(prior_named(name, companions, folder), frame);
}

GaussianPrior reference_velocity(const std::string& name,
                                 const std::vector<Companion>& companions,
                                 const fs::path& folder,
                                 Frame frame) {
    const Companion companion = prior_named(name, companions, folder);
    const VectorPrior prior = parse_prior(companion, frame);
    const auto* gaussian = std::get_if<GaussianPrior>(&prior.kind());
    if (gaussian != nullptr && !gaussian->mean.isZero(0.0)) return *gaussian;
    throw UsageError({companion.path,
                      fmt::format("is of kind {}", prior.kind_name()),
                      "the reference for offsets must be a measured-velocity or gaussian prior",
                      ""});
}

void measure_dispersions(Job& job, const Counts& counts, Terminal& terminal) {
    if (job.measure_dispersion.empty()) return;
    // A dispersion changes how much its bin says about the mode, and so, a little, itself.
    constexpr int rounds = 2;
    std::vector<MeasuredDispersion> measured;
    for (int round = 0; round < rounds; ++round) {
        measured = dispersions_at_mode(job, counts);
        adopt_dispersion(job, dispersion_file(job, measured));
    }
    for (const MeasuredDispersion& one : measured)
        terminal.say(fmt::format("Dispersion of {}/{}: {:.4f} +- {:.4f}, measured.",
                                 job.surveys[one.place.survey].name,
                                 job.surveys[one.place.survey].bins[one.place.bin].name,
                                 one.value,
                                 one.sd));
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
        if (existing != Existing::replace)
            refuse_misfit({path.string(),
                           "was made from other inputs or cuts",
                           "counts are used again only for the same inputs and cuts",
                           "give --replace to count anew, or another folder with -o"},
                          existing);
    }
    return make_counts(job, inputs, folder, terminal);
}

Summarised summarised(const Chain& chain, const fs::path& folder, int threads) {
    const Job job = job_of(chain);
    SummaryOptions options;
    options.title = job.title;
    options.seed = job.seed;
    options.cmb_velocity =
        reference_velocity(cmb_prior_name, chain.provenance.companions, folder, job.frame).mean;
    options.job_warnings = job.warnings;
    options.threads = threads;
    options.effective_draws_wanted = job.ensemble.effective_draws;
    ParameterSpace space(chain.counts, job.model);
    Summary summary = summarise(chain, space, options);
    return {std::move(space), options.cmb_velocity, std::move(summary)};
}

Summarised summarise_into(const Chain& chain,
                          const fs::path& folder,
                          int threads,
                          Terminal& terminal) {
    Summarised result = summarised(chain, folder, threads);
    write_text(folder / "summary.json", to_json(result.summary));
    const std::string text = to_text(result.summary);
    write_text(folder / "summary.txt", text);
    terminal.say(text);
    terminal.say(fmt::format("Written: {} and summary.json beside it.",
                             (folder / "summary.txt").string()));
    return result;
}

}  // namespace deviascope
