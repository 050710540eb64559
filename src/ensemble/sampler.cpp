// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/ensemble/sampler.h"

#include <algorithm>
#include <cmath>
#include <optional>
#include <utility>

#include "deviascope/core/error.h"
#include "deviascope/ensemble/monitored.h"
#include "ensemble/delivery.h"
#include "ensemble/looks.h"
#include "ensemble/mover.h"
#include "ensemble/pace.h"
#include "ensemble/progress_line.h"
#include "ensemble/rows.h"
#include "ensemble/start.h"
#include "ensemble/warm_up_buffer.h"

namespace deviascope {

namespace {

constexpr std::size_t block_bytes = std::size_t{64} << 20U;
constexpr double seconds_per_block = 3.0;
/// A block is not due before this many times the seconds that storing the last one took:
/// storing costs at most about one per cent.
constexpr double blocks_apart = 100.0;
/// Rows that must still fit before max_steps, twice what a stop needs: a badly mixing warm-up
/// asks for intervals so long that none of the rest would be stored.
constexpr std::int64_t rows_that_must_fit = 2 * fewest_rows_to_stop;

EnsembleShape shape_of(const Target& target, const EnsembleOptions& options) {
    return {options.replicates,
            options.walkers_for(target.n_coordinates()),
            target.n_coordinates()};
}

void require_options(const EnsembleOptions& options, Eigen::Index n_coordinates) {
    std::vector<Message> faults;
    for (std::string& problem : options.problems(n_coordinates))
        faults.push_back({std::move(problem), "", "", ""});
    if (!faults.empty()) throw UsageError(std::move(faults));
}

/// The last look of the warm-up; without one that early, half of max_steps itself.
std::int64_t last_warm_up_step(std::int64_t max_steps) {
    const std::int64_t half = std::max<std::int64_t>(1, max_steps / 2);
    if (step_of_look(0) > half) return half;
    std::int64_t look = 0;
    while (step_of_look(look + 1) <= half) ++look;
    return step_of_look(look);
}

/// Half an autocorrelation time, but not so long that too few rows are stored.
std::int64_t interval_for(double autocorrelation_steps, std::int64_t steps_left) {
    const std::int64_t longest = std::max<std::int64_t>(1, steps_left / rows_that_must_fit);
    if (std::isnan(autocorrelation_steps)) return 1;
    const double half = std::ceil(0.5 * autocorrelation_steps);
    if (half >= static_cast<double>(longest)) return longest;
    return std::max<std::int64_t>(1, static_cast<std::int64_t>(half));
}

std::optional<CoordinateGaussian> approximation_of(const Target& target) {
    const CoordinateGaussian* offered = target.approximation();
    if (offered == nullptr) return std::nullopt;
    return *offered;
}

/// Rows stored when each walker has made `step` steps.
std::int64_t n_rows_at(std::int64_t step, std::int64_t discarded, std::int64_t store_every) {
    return (step - discarded) / store_every;
}

/// A stored run as it must be to be gone on with.
class StoredRunCheck {
  public:
    StoredRunCheck(const Target& target, const EnsembleShape& shape)
        : n_parameters_(static_cast<Eigen::Index>(target.parameters().size())), shape_(shape) {}

    void operator()(const StoredRun& stored) const {
        require(stored.draws.n_replicates == shape_.n_replicates &&
                    stored.draws.n_walkers == shape_.n_walkers,
                "its replicates and walkers are not those of the job");
        require(stored.draws.n_parameters == n_parameters_,
                "its parameters are not those of the job");
        const auto n_walkers = static_cast<std::size_t>(shape_.n_replicates * shape_.n_walkers);
        require(stored.state.log_posterior.size() == n_walkers &&
                    stored.state.log_likelihood.size() == n_walkers &&
                    stored.state.coordinates.size() ==
                        n_walkers * static_cast<std::size_t>(shape_.n_coordinates),
                "its state is not one of that many walkers and coordinates");
        require(stored.draws.n_rows > 0 && stored.warm_up.store_every > 0 &&
                    n_rows_at(stored.state.step,
                              stored.warm_up.discarded,
                              stored.warm_up.store_every) == stored.draws.n_rows,
                "its rows are not as many as its steps make");
        require(fits(stored.warm_up.approximation), "its Gaussian is of another dimension");
    }

  private:
    bool fits(const std::optional<CoordinateGaussian>& gaussian) const {
        return !gaussian || (gaussian->mean.size() == shape_.n_coordinates &&
                             gaussian->factor.rows() == shape_.n_coordinates &&
                             gaussian->factor.cols() == shape_.n_coordinates);
    }
    static void require(bool holds, const char* found) {
        if (!holds)
            throw InputError({"the stored run",
                              found,
                              "a run of the same job, stored by the same version, is needed",
                              "start anew"});
    }

    Eigen::Index n_parameters_;
    EnsembleShape shape_;
};

/// One run. What it decides depends on `state_`, `outcome_` and the stored rows (`watched_`)
/// alone, so a run can be taken up again from these.
class Run {
  public:
    Run(const Target& target,
        const EnsembleOptions& options,
        std::optional<CoordinateGaussian> approximation,
        DrawSink& sink)
        : options_(options),
          shape_(shape_of(target, options)),
          target_(target),
          approximation_(std::move(approximation)),
          mover_(target, options, shape_, approximation_ ? &*approximation_ : nullptr),
          writer_(target, options.seed, shape_),
          watch_(options.threads),
          evaluations_at_start_(target.evaluations()),
          watched_(empty_watched()),
          pending_(empty_draws(target, shape_)),
          delivery_(sink, empty_draws(target, shape_)) {}

    Outcome from_the_start() {
        state_ = starting_state(target_, options_, shape_);
        if (!warm_up()) return ended(Outcome::End::interrupted);
        begin_storing();
        return ended(store_until_the_end());
    }

    Outcome from(StoredRun stored) {
        StoredRunCheck(target_, shape_)(stored);
        outcome_.discarded = stored.warm_up.discarded;
        outcome_.store_every = stored.warm_up.store_every;
        outcome_.warm_up_settled = stored.warm_up.settled;
        outcome_.n_rows = stored.draws.n_rows;
        watched_.append(stored.draws, 0, stored.draws.n_rows, options_.threads);
        state_ = std::move(stored.state);
        evaluations_before_ = state_.evaluations;
        stored = {};
        begin_storing();
        return ended(store_until_the_end());
    }

  private:
    // ---- warm-up ----

    /// False if interrupted.
    bool warm_up() {
        WarmUpBuffer buffer(empty_draws(target_, shape_));
        const std::int64_t last = last_warm_up_step(options_.max_steps);
        for (std::int64_t look = 0;; ++look) {
            if (!warm_up_to(std::min(step_of_look(look), last), buffer)) return false;
            outcome_.warm_up_settled = warm_up_has_settled(buffer);
            if (outcome_.warm_up_settled || state_.step == last) break;
        }
        end_warm_up(buffer);
        return true;
    }

    bool warm_up_to(std::int64_t step, WarmUpBuffer& buffer) {
        while (state_.step < step) {
            if (stop_is_requested()) return false;
            buffer.make_room();
            const std::int64_t n_steps = std::min({pace_.steps(),
                                                   step - state_.step,
                                                   buffer.last_step_that_fits() - state_.step});
            buffer.extend_to(state_.step + n_steps);
            advance(n_steps, [&](Eigen::Index replicate, std::int64_t at) {
                if (!buffer.keeps(at)) return;
                const RowWriter::Place place{replicate, at, buffer.row_of(at)};
                writer_.write(state_, place, Redrawn::left_nan, buffer.rows());
            });
            tell();
        }
        return true;
    }

    WatchedSeries later_half(const WarmUpBuffer& buffer) const {
        WatchedSeries half = empty_watched();
        half.append(
            buffer.draws(), buffer.later_half(), buffer.draws().n_rows, options_.threads);
        return half;
    }

    bool warm_up_has_settled(const WarmUpBuffer& buffer) {
        last_look_ = watch_.look(later_half(buffer), buffer.spacing(), warm_up_rule);
        tell();
        return last_look_.passed;
    }

    void end_warm_up(WarmUpBuffer& buffer) {
        outcome_.discarded = state_.step;
        outcome_.store_every = options_.store_every;
        if (outcome_.store_every == 0) {
            const LookResult all =
                watch_.look_at_all(later_half(buffer), buffer.spacing(), warm_up_rule);
            outcome_.store_every = interval_for(all.longest_autocorrelation_steps,
                                                options_.max_steps - state_.step);
        }
        WarmUp warm_up;
        warm_up.step = buffer.steps();
        warm_up.buffer = buffer.take();
        warm_up.settled = outcome_.warm_up_settled;
        warm_up.discarded = outcome_.discarded;
        warm_up.store_every = outcome_.store_every;
        warm_up.approximation = approximation_;
        warm_up.warnings = target_.warnings();
        delivery_.warm_up(warm_up);
    }

    // ---- storing ----

    void begin_storing() {
        last_look_ = {};
        began_storing_at_ = state_.step;
        is_state_stored_ = true;
        storing_since_ = delivered_at_ = seconds_now();
    }

    Outcome::End store_until_the_end() {
        for (;;) {
            if (is_look_due()) {
                if (look_passes()) return delivered(Outcome::End::converged);
                if (state_.step >= options_.max_steps)
                    return delivered(Outcome::End::max_steps);
                ++state_.look;
                is_state_stored_ = false;
            }
            if (stop_is_requested()) return delivered(Outcome::End::interrupted);
            store_leg();
            delivery_.settle_if_done();
            if (is_block_due()) deliver();
            tell();
        }
    }

    /// The last block may hold no rows: where walkers stand at the end is no matter of the
    /// clock.
    Outcome::End delivered(Outcome::End end) {
        deliver();
        if (outcome_.n_rows > 0 && !is_state_stored_) store_block();
        delivery_.settle();
        return end;
    }

    std::int64_t next_look() const {
        return std::min(outcome_.discarded + step_of_look(state_.look), options_.max_steps);
    }
    bool is_look_due() const { return state_.step >= next_look(); }

    /// A warm-up that did not settle cannot be made good: the look is then only for show.
    bool look_passes() {
        last_look_ = watch_.look(
            watched_, outcome_.store_every, stopping_rule(options_.effective_draws));
        last_look_step_ = state_.step;
        tell();
        return last_look_.passed && watched_.n_rows() >= fewest_rows_to_stop &&
               outcome_.warm_up_settled;
    }

    std::int64_t rows_up_to(std::int64_t step) const {
        return n_rows_at(step, outcome_.discarded, outcome_.store_every);
    }

    std::int64_t most_rows_in_block() const {
        if (options_.rows_per_block > 0) return options_.rows_per_block;
        const auto most = static_cast<std::int64_t>(block_bytes / row_bytes(pending_));
        const std::int64_t together = delivery_.rows_together();
        return std::max<std::int64_t>(1, most < together ? most : most / together * together);
    }

    /// Rows that are missing to a number that is good to end a block on; 0 if it is reached.
    std::int64_t rows_to_good_end() const {
        const std::int64_t together = delivery_.rows_together();
        const std::int64_t odd = (outcome_.n_rows + pending_.n_rows) % together;
        return odd == 0 && pending_.n_rows > 0 ? 0 : together - odd;
    }

    /// Steps up to which the block cannot end.
    std::int64_t steps_to_block() const {
        std::int64_t rows = most_rows_in_block() - pending_.n_rows;
        if (is_time_for_block()) rows = std::min(rows, rows_to_good_end());
        return rows * outcome_.store_every;
    }

    void store_leg() {
        const std::int64_t n_steps =
            std::min({pace_.steps(), next_look() - state_.step, steps_to_block()});
        if (n_steps == 0) return;  // a block has come due this instant
        const std::int64_t delivered = outcome_.n_rows;
        const Eigen::Index first_new = pending_.n_rows;
        if (first_new == 0) make_room();
        resize_rows(pending_, rows_up_to(state_.step + n_steps) - delivered);
        advance(n_steps, [&](Eigen::Index replicate, std::int64_t at) {
            if ((at - outcome_.discarded) % outcome_.store_every != 0) return;
            const RowWriter::Place place{replicate, at, rows_up_to(at) - 1 - delivered};
            writer_.write(state_, place, Redrawn::drawn, pending_);
        });
        is_state_stored_ = false;
        watched_.append(pending_, first_new, pending_.n_rows, options_.threads);
    }

    /// For a whole block, or for all that can come.
    void make_room() {
        const std::int64_t to_come = rows_up_to(options_.max_steps) - outcome_.n_rows;
        reserve_rows(pending_, std::min(most_rows_in_block(), to_come));
    }

    bool is_block_due() const {
        if (pending_.n_rows >= most_rows_in_block()) return true;
        return is_time_for_block() && rows_to_good_end() == 0;
    }

    bool is_time_for_block() const {
        return options_.rows_per_block == 0 &&
               seconds_now() - delivered_at_ >=
                   std::max(seconds_per_block, blocks_apart * delivery_.seconds_to_store());
    }

    /// Where blocks end has no bearing on draws or decisions.
    void deliver() {
        if (pending_.n_rows > 0) store_block();
        delivered_at_ = seconds_now();
    }

    void store_block() {
        state_.evaluations = evaluations_so_far();
        outcome_.n_rows += pending_.n_rows;
        delivery_.block(pending_, state_);
        is_state_stored_ = true;
    }

    // ---- common to both ----

    WatchedSeries empty_watched() const {
        return {monitored_scalars(target_.parameters(), target_.vectors()),
                shape_.n_replicates,
                shape_.n_walkers};
    }

    bool stop_is_requested() const {
        return options_.stop_requested && options_.stop_requested();
    }

    void advance(std::int64_t n_steps, const AfterStep& after_step) {
        const double began = seconds_now();
        mover_.advance(state_, n_steps, after_step);
        pace_.took(n_steps, seconds_now() - began);
    }

    /// Those of a run before this one included.
    std::vector<EvaluationCount> evaluations_so_far() const {
        std::vector<EvaluationCount> all = target_.evaluations();
        for (std::size_t way = 0; way < all.size(); ++way) {
            all[way].times -= evaluations_at_start_[way].times;
            if (way < evaluations_before_.size())
                all[way].times += evaluations_before_[way].times;
        }
        return all;
    }

    Outcome ended(Outcome::End end) {
        outcome_.end = end;
        outcome_.steps = state_.step;
        outcome_.tally = state_.tally;
        return outcome_;
    }

    // ---- progress ----

    void tell() const {
        if (!options_.progress) return;
        Standing standing;
        standing.step = state_.step;
        standing.is_warming_up = outcome_.discarded == 0;
        standing.worst_rhat = last_look_.worst_rhat;
        if (!standing.is_warming_up) {
            standing.effective_draws = last_look_.fewest_effective_draws;
            standing.effective_draws_wanted = options_.effective_draws;
            standing.seconds_left = seconds_left();
        }
        options_.progress(progress_line(standing));
    }

    /// At the pace so far, up to the look at which there should be draws enough.
    double seconds_left() const {
        const double found = last_look_.fewest_effective_draws;
        const std::int64_t stored = state_.step - began_storing_at_;
        if (std::isnan(found) || stored == 0) return Standing::unknown;
        const double needed = static_cast<double>(last_look_step_ - outcome_.discarded) *
                              options_.effective_draws / found;
        std::int64_t look = state_.look;
        std::int64_t end = next_look();
        while (end < options_.max_steps &&
               (!outcome_.warm_up_settled || static_cast<double>(step_of_look(look)) < needed))
            end = std::min(outcome_.discarded + step_of_look(++look), options_.max_steps);
        const double per_step = (seconds_now() - storing_since_) / static_cast<double>(stored);
        return static_cast<double>(end - state_.step) * per_step;
    }

    const EnsembleOptions& options_;
    EnsembleShape shape_;
    const Target& target_;
    std::optional<CoordinateGaussian> approximation_;
    Mover mover_;
    RowWriter writer_;
    Watch watch_;
    std::vector<EvaluationCount> evaluations_at_start_;  ///< of the target's own count
    std::vector<EvaluationCount> evaluations_before_;    ///< of the run that is gone on with
    Pace pace_;

    EnsembleState state_;
    Outcome outcome_;        ///< what is decided so far; n_rows: delivered
    WatchedSeries watched_;  ///< of all stored rows
    Draws pending_;          ///< rows not yet delivered
    Delivery delivery_;
    bool is_state_stored_ = false;  ///< by the last block

    LookResult last_look_;  ///< for progress only, like the rest
    std::int64_t last_look_step_ = 0;
    std::int64_t began_storing_at_ = 0;
    double storing_since_ = 0.0;
    double delivered_at_ = 0.0;
};

}  // namespace

Outcome sample(const Target& target, const EnsembleOptions& options, DrawSink& sink) {
    require_options(options, target.n_coordinates());
    return Run(target, options, approximation_of(target), sink).from_the_start();
}

Outcome resume_sampling(const Target& target,
                        const EnsembleOptions& options,
                        StoredRun stored,
                        DrawSink& sink) {
    require_options(options, target.n_coordinates());
    std::optional<CoordinateGaussian> approximation = stored.warm_up.approximation;
    return Run(target, options, std::move(approximation), sink).from(std::move(stored));
}

}  // namespace deviascope
