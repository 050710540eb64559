// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/core/parallel.h"

#include <omp.h>

#include <algorithm>
#include <exception>
#include <limits>

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

int default_threads() {
    return std::max(1, omp_get_max_threads());
}

}  // namespace deviascope
