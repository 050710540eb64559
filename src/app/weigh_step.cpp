// SPDX-License-Identifier: GPL-2.0-or-later
#include "app/weigh_step.h"

#include <fmt/format.h>

#include <cmath>

#include "deviascope/core/error.h"
#include "deviascope/core/grouped_number.h"
#include "job/text_file.h"
#include "summary/text_table.h"

namespace deviascope {

namespace fs = std::filesystem;

namespace {

std::string weight_text(const BinReport& bin) {
    if (bin.sd <= 0.0) return fmt::format("{:.4g}", bin.mean);
    const int digits = std::max(0, 1 - static_cast<int>(std::floor(std::log10(bin.sd))));
    return fmt::format("{:.{}f} +- {:.{}f}", bin.mean, digits, bin.sd, digits);
}

std::string table_of_weights(const MeasuredWeights& weights) {
    TextTable table("lrrrr");
    table.row({"bin", "sources", "weight", "windows halved", "doubled"});
    for (const BinReport& bin : weights.bins)
        table.row({bin.name,
                   grouped(bin.sources),
                   weight_text(bin),
                   fmt::format("{:.4g}", bin.with_half_windows),
                   fmt::format("{:.4g}", bin.with_twice_windows)});
    return table.text();
}

std::string table_of_edges(const MeasuredWeights& weights) {
    TextTable table("llrrlrrl");
    table.row({"bin", "edge", "adds", "sources", "method", "inside", "outside", "in"});
    for (const BinReport& bin : weights.bins) {
        for (const EdgeReport& edge : bin.edges) {
            const bool crossed = edge.method != EdgeMethod::end_of_property;
            const auto width = [&](double w) {
                return crossed ? fmt::format("{:.2f}", w) : std::string();
            };
            table.row({bin.name,
                       fmt::format("{} {}", edge.property, edge.value),
                       fmt::format("{:+.3f}", edge.term),
                       crossed ? grouped(edge.sources) : "",
                       name_of(edge.method),
                       width(edge.inside),
                       width(edge.outside),
                       crossed ? edge.unit : ""});
        }
    }
    return table.text();
}

std::string table_of_experiments(const MeasuredWeights& weights) {
    TextTable table("lrrr");
    table.row({"full-sky experiment", "dipole", "expected", "standard deviations apart"});
    for (const BinReport& bin : weights.bins) {
        if (!bin.experiment) continue;
        if (bin.experiment->possible) {
            table.row({bin.name,
                       fmt::format("{:.5f}", bin.experiment->dipole),
                       fmt::format("{:.5f}", bin.experiment->expected),
                       fmt::format("{:+.1f}", bin.experiment->pull())});
        } else {
            table.row(
                {bin.name, "", "", "not possible: sources beyond the limits are missing"});
        }
    }
    return table.text();
}

std::string table_of_scatter(const MeasuredWeights& weights) {
    TextTable table("lrr");
    table.row({"measurement scatter", "weight as observed", "without scatter"});
    for (const BinReport& bin : weights.bins)
        table.row({bin.name,
                   fmt::format("{:.3f}", bin.mean),
                   bin.scatter_free ? fmt::format("{:.3f}", *bin.scatter_free) : "unknown"});
    std::string text = table.text();
    if (weights.scatter_shift)
        text += fmt::format(
            "\nWith weights of scatter-free distributions the velocity would come out {:.4f} ± "
            "{:.4f} of the true one\nwith a free intrinsic dipole, {:.4f} ± {:.4f} without "
            "one. The weights as observed are the right ones for\nthis catalogue.\n",
            weights.scatter_shift->free_intrinsic,
            weights.scatter_shift->free_intrinsic_sd,
            weights.scatter_shift->no_intrinsic,
            weights.scatter_shift->no_intrinsic_sd);
    return text;
}

void say_weights(const MeasuredWeights& weights, Terminal& terminal) {
    terminal.say(
        fmt::format("\nKinematic weights of {}, errors from {} bootstrap replicates:\n\n{}",
                    weights.survey,
                    weights.replicates,
                    table_of_weights(weights)));
    terminal.say(table_of_edges(weights));
    if (weights.experiment_speed > 0.0) terminal.say(table_of_experiments(weights));
    const bool scatters = std::ranges::any_of(
        weights.bins, [](const BinReport& bin) { return bin.scatter_free.has_value(); });
    if (scatters) terminal.say(table_of_scatter(weights));
    for (const std::string& warning : weights.warnings)
        terminal.warn(fmt::format("{}: {}", weights.survey, warning));
}

/// The folder's weights file of a survey where it fits; empty where there is none.
std::optional<std::string> stored_weights(const fs::path& path,
                                          const std::string& digest,
                                          Existing existing) {
    const auto text = text_of_file(path);
    if (!text) return std::nullopt;
    if (digest_in_weights_file({"", path.string(), *text}) == digest) return text;
    if (existing == Existing::replace) return std::nullopt;
    refuse_misfit({path.string(),
                   "was measured from other inputs or settings",
                   "measured weights are used again only for the same inputs",
                   "give --replace to measure anew, or another folder with -o"},
                  existing);
}

}  // namespace

std::string name_of_weights_file(const std::string& survey) {
    return survey + "-weights.toml";
}

std::vector<std::string> names_of_weights_files(const Job& job) {
    std::vector<std::string> names;
    for (std::size_t s = 0; s < job.surveys.size(); ++s)
        if (job.weighing[s].unmeasured)
            names.push_back(name_of_weights_file(job.surveys[s].name));
    return names;
}

std::string weigh_survey(const WeighStep& step, std::size_t survey, Terminal& terminal) {
    const SurveyWeighing& weighing = step.job.weighing[survey];
    WeighOptions options;
    options.seed = step.job.seed;
    options.survey = survey;
    options.threads = step.threads;
    options.experiment_speed = step.experiment_speed;
    options.progress = ending_on_request(terminal.progress());
    const MeasuredWeights weights = measure_weights(step.job.surveys[survey],
                                                    weighing.physics,
                                                    weighing.bins,
                                                    Pixelisation(step.job.nside),
                                                    step.job.frame,
                                                    options);
    say_weights(weights, terminal);
    return weights_file_text(weights, digest_of_weighing(step.job, survey, step.inputs.files));
}

Job with_measured_weights(const WeighStep& step,
                          const fs::path& folder,
                          Existing existing,
                          bool anew,
                          Terminal& terminal) {
    const Job& job = step.job;
    std::vector<Companion> measured;
    for (std::size_t s = 0; s < job.surveys.size(); ++s) {
        if (!job.weighing[s].unmeasured) continue;
        const std::string& survey = job.surveys[s].name;
        const fs::path path = folder / name_of_weights_file(survey);
        const std::string digest = digest_of_weighing(job, s, step.inputs.files);
        std::optional<std::string> text;
        if (!folder.empty() && !anew) text = stored_weights(path, digest, existing);
        if (text) {
            terminal.say(fmt::format("Weights of {} taken from {}: its inputs are unchanged.",
                                     survey,
                                     path.string()));
        } else {
            text = weigh_survey(step, s, terminal);
            if (!folder.empty()) write_text(path, *text);
        }
        measured.push_back({name_of_measured_weights(survey), path.string(), *text});
    }
    return measured.empty() ? job : completed(job, measured);
}

Job weighed(const Job& job, int threads, Terminal& terminal) {
    if (!job.is_unmeasured()) return job;
    const InputRecord inputs{digests_of_inputs(job, ending_on_request(terminal.progress())),
                             ""};
    return with_measured_weights({job, inputs, threads}, {}, Existing::refuse, true, terminal);
}

}  // namespace deviascope
