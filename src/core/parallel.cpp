// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/core/parallel.h"

#include <omp.h>

#include <algorithm>
#include <exception>
#include <limits>
#include <mutex>
#include <optional>
#include <vector>

namespace deviascope {

namespace {

/// Keeps the exception of the lowest index; an exception that leaves an OpenMP region would end
/// the process.
class FirstFailure {
  public:
    void keep(std::size_t index, std::exception_ptr failure) {
#pragma omp critical(deviascope_first_failure)
        if (index < index_) {
            index_ = index;
            failure_ = std::move(failure);
        }
    }
    void rethrow() const {
        if (failure_) std::rethrow_exception(failure_);
    }

  private:
    std::size_t index_ = std::numeric_limits<std::size_t>::max();
    std::exception_ptr failure_;
};

/// Sequences of parts, handed out to threads.
class Sequences {
  public:
    Sequences(std::size_t n_sequences, std::size_t n_parts)
        : n_parts_(n_parts), n_done_(n_sequences, 0), is_taken_(n_sequences, false) {}

    struct Part {
        std::size_t sequence, number;
    };
    /// The next of those no thread is at; none where there is nothing left to begin.
    std::optional<Part> take() {
        const std::lock_guard lock(mutex_);
        std::optional<Part> next;
        for (std::size_t sequence = 0; sequence < n_done_.size(); ++sequence) {
            const std::size_t n_done = n_done_[sequence];
            if (is_taken_[sequence] || n_done == n_parts_) continue;
            if (!next || n_done < next->number) next = {sequence, n_done};
        }
        if (next) is_taken_[next->sequence] = true;
        return next;
    }
    void give_back(const Part& done) { leave_at(done.sequence, done.number + 1); }
    void end(const Part& failed) { leave_at(failed.sequence, n_parts_); }

  private:
    void leave_at(std::size_t sequence, std::size_t n_done) {
        const std::lock_guard lock(mutex_);
        n_done_[sequence] = n_done;
        is_taken_[sequence] = false;
    }

    std::size_t n_parts_;
    std::mutex mutex_;
    std::vector<std::size_t> n_done_;
    std::vector<bool> is_taken_;
};

}  // namespace

void parallel_for(std::size_t n, int threads, const std::function<void(std::size_t)>& body) {
    if (threads <= 1 || n <= 1) {
        for (std::size_t index = 0; index < n; ++index) body(index);
        return;
    }
    const int team = static_cast<int>(std::min(n, static_cast<std::size_t>(threads)));
    if (omp_get_max_active_levels() < 2) omp_set_max_active_levels(2);
    FirstFailure failure;
#pragma omp parallel for num_threads(team) schedule(dynamic, 1)
    for (std::size_t index = 0; index < n; ++index) {
        try {
            body(index);
        } catch (...) {
            failure.keep(index, std::current_exception());
        }
    }
    failure.rethrow();
}

void parallel_sequences(std::size_t n_sequences,
                        std::size_t n_parts,
                        int threads,
                        const std::function<void(std::size_t, std::size_t)>& body) {
    Sequences sequences(n_sequences, n_parts);
    FirstFailure failure;
    const auto team = std::min(n_sequences, static_cast<std::size_t>(std::max(threads, 1)));
    parallel_for(team, threads, [&](std::size_t) {
        while (const auto part = sequences.take()) {
            try {
                body(part->sequence, part->number);
                sequences.give_back(*part);
            } catch (...) {
                failure.keep(part->sequence, std::current_exception());
                sequences.end(*part);
            }
        }
    });
    failure.rethrow();
}

int default_threads() {
    return std::max(1, omp_get_max_threads());
}

}  // namespace deviascope
