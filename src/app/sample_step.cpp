// SPDX-License-Identifier: GPL-2.0-or-later
#include "app/sample_step.h"

#include <fmt/format.h>

#include <chrono>
#include <utility>

#include "app/interrupt.h"
#include "app/output_folder.h"
#include "app/steps.h"
#include "deviascope/core/grouped_number.h"
#include "deviascope/model/posterior.h"

namespace deviascope {

namespace {

/// Tells of each block once it is stored; for tests that hold the program to its word.
class TellingSink : public DrawSink {
  public:
    TellingSink(DrawSink& sink, Terminal& terminal) : sink_(sink), terminal_(terminal) {}
    void warm_up(const WarmUp& warm_up) override { sink_.warm_up(warm_up); }
    void block(const Draws& rows, const EnsembleState& state) override {
        sink_.block(rows, state);
        terminal_.say(fmt::format("Stored {} rows up to step {}.", rows.n_rows, state.step));
    }
    std::int64_t rows_together(Eigen::Index n_rows) const override {
        return sink_.rows_together(n_rows);
    }

  private:
    DrawSink& sink_;
    Terminal& terminal_;
};

EnsembleOptions options_of(const SampleStep& step, Terminal& terminal) {
    EnsembleOptions options = step.job.ensemble;
    options.seed = step.job.seed;
    options.threads = step.options.n_threads();
    options.rows_per_block = step.options.rows_per_block;
    options.stop_requested = interrupt_requested;
    options.progress = terminal.progress();
    return options;
}

/// Runs `sampling` with the sink for `writer`, and marks the end of the chain.
template <class Sampling>
Outcome finished(const SampleStep& step,
                 ChainWriter& writer,
                 Terminal& terminal,
                 Sampling&& sampling) {
    TellingSink telling(writer, terminal);
    DrawSink& sink = step.options.rows_per_block > 0 ? static_cast<DrawSink&>(telling) : writer;
    const Outcome outcome = sampling(sink);
    writer.finish(outcome, time_now());
    return outcome;
}

Outcome sample_anew(const SampleStep& step,
                    const Posterior& posterior,
                    const EnsembleOptions& options,
                    Terminal& terminal) {
    terminal.say(fmt::format("Sampling {} coordinates with {} ensembles of {} walkers.",
                             posterior.n_coordinates(),
                             options.replicates,
                             options.walkers_for(posterior.n_coordinates())));
    ChainWriter writer(step.lock,
                       step.provenance,
                       posterior.parameters(),
                       posterior.vectors(),
                       step.counts,
                       options);
    return finished(step, writer, terminal, [&](DrawSink& sink) {
        return sample(posterior, options, sink);
    });
}

Outcome go_on(const SampleStep& step,
              const Posterior& posterior,
              const EnsembleOptions& options,
              Chain stored,
              Terminal& terminal) {
    terminal.say(fmt::format("Going on from step {} of a chain of {} rows.",
                             grouped(stored.state.step),
                             grouped(stored.draws.n_rows)));
    ChainWriter writer(step.lock, stored);
    StoredRun run{std::move(stored.warm_up), std::move(stored.draws), std::move(stored.state)};
    return finished(step, writer, terminal, [&](DrawSink& sink) {
        return resume_sampling(posterior, options, std::move(run), sink);
    });
}

void report(const Outcome& outcome, double seconds, Terminal& terminal) {
    const char* end = outcome.end == Outcome::End::converged     ? "converged"
                      : outcome.end == Outcome::End::interrupted ? "interrupted"
                                                                 : "NOT converged at max_steps";
    terminal.say(
        fmt::format("Sampled {} steps per walker, the first {} discarded, every {} stored: "
                    "{} ({:.1f} s).",
                    grouped(outcome.steps),
                    grouped(outcome.discarded),
                    outcome.store_every,
                    end,
                    seconds));
}

void note_interruption(const SampleStep& step, const Outcome& outcome, Terminal& terminal) {
    const std::string found =
        outcome.n_rows == 0
            ? "interrupted before the first row was stored"
            : fmt::format("interrupted; {} rows up to step {} are stored and can be summarised",
                          grouped(outcome.n_rows),
                          grouped(outcome.steps));
    terminal.note(Message{
        step.lock.chain().string(), found, "", "give the same command with --resume to go on"}
                      .text());
}

/// Removes what is begun anew: a chain to be replaced, with all made of it, or one without
/// draws (a warm-up is gone through again).
void clear_the_way(const SampleStep& step, const StoredChain& stored) {
    const std::filesystem::path folder = step.lock.chain().parent_path();
    if (step.options.replace) {
        remove_results(folder, {"chains.h5", "summary.json", "summary.txt"});
        remove_results(folder, drawn_results(folder));
    }
    if (stored.progressed == Progressed::in_warm_up) remove_results(folder, {"chains.h5"});
}

}  // namespace

Outcome sample_into_chain(const SampleStep& step, StoredChain stored, Terminal& terminal) {
    if (stored.progressed == Progressed::finished) {
        terminal.say(fmt::format("The chain is complete: {} rows in {}.",
                                 grouped(stored.chain.draws.n_rows),
                                 step.lock.chain().string()));
        return stored.chain.outcome;
    }
    const Posterior posterior(step.counts, step.job.model, step.job.seed);
    const EnsembleOptions options = options_of(step, terminal);
    if (interrupt_requested()) throw Interrupted();
    const auto begin = std::chrono::steady_clock::now();
    clear_the_way(step, stored);
    const Outcome outcome =
        stored.progressed == Progressed::storing
            ? go_on(step, posterior, options, std::move(stored.chain), terminal)
            : sample_anew(step, posterior, options, terminal);
    const std::chrono::duration<double> elapsed = std::chrono::steady_clock::now() - begin;
    report(outcome, elapsed.count(), terminal);
    if (outcome.end == Outcome::End::interrupted) note_interruption(step, outcome, terminal);
    return outcome;
}

}  // namespace deviascope
