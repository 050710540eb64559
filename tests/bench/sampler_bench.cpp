// SPDX-License-Identifier: GPL-2.0-or-later
// Effective draws per core-second of the whole sampler on the benchmarks' reference problem, by
// kernels; threads; and what storing costs. Everything in one run: read the ratios.
#include <fmt/format.h>
#include <time.h>

#include <algorithm>
#include <chrono>
#include <thread>

#include "bench_problem.h"
#include "deviascope/chain/chain_file.h"
#include "deviascope/ensemble/diagnostics.h"
#include "deviascope/ensemble/monitored.h"
#include "deviascope/ensemble/sampler.h"
#include "deviascope/model/posterior.h"
#include "temporary_folder.h"

using namespace deviascope;

namespace {

/// Keeps the draws where they can be diagnosed.
class Keeper : public DrawSink {
  public:
    void warm_up(const WarmUp&) override {}
    void block(const Draws& rows, const EnsembleState&) override {
        if (draws.n_rows == 0) {
            draws = rows;
            return;
        }
        draws.n_rows += rows.n_rows;
        draws.value.insert(draws.value.end(), rows.value.begin(), rows.value.end());
    }
    Draws draws;
};

/// Counts the bytes of the draws and lets them go: a run that stores nothing.
class Counter : public DrawSink {
  public:
    void warm_up(const WarmUp&) override {}
    void block(const Draws& rows, const EnsembleState&) override {
        megabytes += static_cast<double>(rows.value.size() * sizeof(double)) / 1e6;
    }
    double megabytes = 0.0;
};

double wall_seconds() {
    using namespace std::chrono;
    return duration<double>(steady_clock::now().time_since_epoch()).count();
}

double worst_effective_draws(const Posterior& target, const Draws& draws, std::int64_t every) {
    double worst = 1e300;
    for (const ScalarDiagnostics& scalar :
         diagnose(monitored_scalars(target.parameters(), target.vectors()), draws, every, 1))
        worst = std::min(worst, scalar.effective_draws());
    return worst;
}

EnsembleOptions options_with(const KernelFractions& kernels, double wanted, int threads) {
    EnsembleOptions options;
    options.seed = 1;
    options.kernels = kernels;
    options.effective_draws = wanted;
    options.threads = threads;
    return options;
}

void compare_kernels(const Posterior& target) {
    fmt::print("one thread, until 10,000 effective draws of the worst scalar\n");
    fmt::print("  stretch  diff.-ev.  indep.   steps  effective draws  per core-second\n");
    for (const KernelFractions& kernels : {KernelFractions{0.2, 0.3, 0.5},
                                           KernelFractions{0.1, 0.2, 0.7},
                                           KernelFractions{0.0, 0.1, 0.9},
                                           KernelFractions{0.0, 0.0, 1.0},
                                           KernelFractions{0.4, 0.6, 0.0},
                                           KernelFractions{1.0, 0.0, 0.0}}) {
        Keeper keeper;
        const double begin = bench::cpu_seconds();
        const Outcome outcome = sample(target, options_with(kernels, 10000, 1), keeper);
        const double seconds = bench::cpu_seconds() - begin;
        const double draws = worst_effective_draws(target, keeper.draws, outcome.store_every);
        fmt::print("  {:7.2f}  {:9.2f}  {:6.2f}  {:6}  {:15.0f}  {:15.0f}{}\n",
                   kernels.stretch,
                   kernels.differential_evolution,
                   kernels.independence,
                   outcome.steps,
                   draws,
                   draws / seconds,
                   outcome.end == Outcome::End::converged ? "" : "  (not converged)");
    }
}

/// Wall seconds of so many threads that each spin through the same work.
double spin(int threads) {
    const double begin = wall_seconds();
    std::vector<std::thread> spinning;
    for (int thread = 0; thread < threads; ++thread)
        spinning.emplace_back([] {
            volatile double x = 1.0;
            for (int k = 0; k < 300'000'000; ++k) x = x * 1.0000001;
        });
    for (std::thread& one : spinning) one.join();
    return wall_seconds() - begin;
}

/// The sampler on one and two threads, and spin loops between them, which tell what two cores
/// of this machine give at the time.
void compare_threads(const Posterior& target) {
    std::vector<double> gains, ceilings;
    for (int pair = 0; pair < 7; ++pair) {
        double seconds[2] = {}, spinning[2] = {};
        for (const int threads : {1, 2}) {
            Counter counter;
            const double begin = wall_seconds();
            sample(target, options_with({}, 50000, threads), counter);
            seconds[threads - 1] = wall_seconds() - begin;
            spinning[threads - 1] = spin(threads);
        }
        gains.push_back(seconds[0] / seconds[1]);
        ceilings.push_back(2.0 * spinning[0] / spinning[1]);
    }
    fmt::print(
        "two threads against one, medians of 7 interleaved pairs: the sampler {:.2f} times as "
        "fast, spin loops {:.2f}; ratio {:.2f}\n",
        bench::median(gains),
        bench::median(ceilings),
        bench::median(gains) / bench::median(ceilings));
}

double thread_seconds() {
    timespec now{};
    clock_gettime(CLOCK_THREAD_CPUTIME_ID, &now);
    return static_cast<double>(now.tv_sec) + 1e-9 * static_cast<double>(now.tv_nsec);
}

/// Times another sink: seconds of a core, and of the clock.
class Timed : public DrawSink {
  public:
    explicit Timed(DrawSink& sink) : sink_(sink) {}
    void warm_up(const WarmUp& warm_up) override { sink_.warm_up(warm_up); }
    void block(const Draws& rows, const EnsembleState& state) override {
        const double wall_before = wall_seconds(), core_before = thread_seconds();
        sink_.block(rows, state);
        core_seconds += thread_seconds() - core_before;
        seconds += wall_seconds() - wall_before;
        megabytes += static_cast<double>(rows.value.size() * sizeof(double)) / 1e6;
    }
    std::int64_t rows_together(Eigen::Index n_rows) const override {
        return sink_.rows_together(n_rows);
    }

    double core_seconds = 0.0, seconds = 0.0, megabytes = 0.0;

  private:
    DrawSink& sink_;
};

/// Runs that store and runs that do not, in turns.
void measure_storing(
    const Posterior& target, const Counts& counts, double wanted, int threads, int n_pairs) {
    const EnsembleOptions options = options_with({}, wanted, threads);
    std::vector<double> without, with, costs, per_megabyte, waits;
    double megabytes = 0.0;
    for (int pair = 0; pair < n_pairs; ++pair) {
        Counter counter;
        double begin = wall_seconds();
        sample(target, options, counter);
        without.push_back(wall_seconds() - begin);
        const test::TemporaryFolder folder;
        begin = wall_seconds();
        ChainWriter writer(ChainLock(folder / "chains.h5"),
                           {},
                           target.parameters(),
                           target.vectors(),
                           counts,
                           options);
        Timed timed(writer);
        const Outcome outcome = sample(target, options, timed);
        writer.finish(outcome, "");
        with.push_back(wall_seconds() - begin);
        costs.push_back(with.back() / without.back() - 1.0);
        megabytes = timed.megabytes;
        per_megabyte.push_back(1e3 * timed.core_seconds / megabytes);
        waits.push_back(1e3 * timed.seconds / megabytes);
    }
    fmt::print(
        "storing {:.0f} MB of draws, {} thread{}: a MB takes {:.1f} ms of a core and {:.1f} ms "
        "of time; the run takes {:.1f} s without and {:.1f} s with, {:.1f} % longer (medians "
        "of "
        "{} pairs)\n",
        megabytes,
        threads,
        threads == 1 ? "" : "s",
        bench::median(per_megabyte),
        bench::median(waits),
        bench::median(without),
        bench::median(with),
        100.0 * bench::median(costs),
        n_pairs);
}

}  // namespace

/// The parts named, of kernels, threads, storing and storing-long; without names, the first
/// three.
int main(int argc, char** argv) {
    const std::vector<std::string> named(argv + 1, argv + argc);
    const auto wants = [&](const char* part) {
        return named.empty() || std::find(named.begin(), named.end(), part) != named.end();
    };
    const Counts counts = bench::make_counts(64, 1e7);
    const Posterior target(counts, bench::make_model(Engine::automatic));
    if (wants("kernels")) compare_kernels(target);
    if (wants("threads")) compare_threads(target);
    if (wants("storing"))
        for (const int threads : {1, 2}) measure_storing(target, counts, 4e5, threads, 5);
    if (!named.empty() && wants("storing-long"))  // runs of a minute and more
        for (const int threads : {1, 2}) measure_storing(target, counts, 5e6, threads, 3);
}
