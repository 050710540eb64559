// SPDX-License-Identifier: GPL-2.0-or-later
// ENSEMBLE, inside: what is kept of the warm-up
#pragma once

#include <cstdint>
#include <vector>

#include "deviascope/ensemble/draws.h"

namespace deviascope {

/// Keeps every 2^j-th step, at most `most_rows` of them: when full, every second row is dropped
/// and j grows by one. Row r holds step (r + 1) 2^j, so what is kept depends on the step alone.
class WarmUpBuffer {
  public:
    static constexpr Eigen::Index most_rows = 512;

    /// @param empty  draws without rows, of the shape to keep
    explicit WarmUpBuffer(Draws empty);

    /// Steps from one row to the next, 2^j.
    std::int64_t spacing() const { return spacing_; }
    const Draws& draws() const { return draws_; }
    std::vector<std::int64_t> steps() const;

    /// Drops every second row if the buffer is full.
    void make_room();
    /// The last step that fits without dropping rows.
    std::int64_t last_step_that_fits() const { return spacing_ * most_rows; }
    /// Makes the rows of all kept steps up to `step`, to be filled through `rows`.
    void extend_to(std::int64_t step);

    bool keeps(std::int64_t step) const { return step % spacing_ == 0; }
    Eigen::Index row_of(std::int64_t step) const { return step / spacing_ - 1; }
    Draws& rows() { return draws_; }

    /// First row of the later half.
    Eigen::Index later_half() const { return draws_.n_rows - draws_.n_rows / 2; }
    /// Hands the rows over; the buffer is empty afterwards.
    Draws take() { return std::move(draws_); }

  private:
    std::int64_t spacing_ = 1;
    Draws draws_;
};

}  // namespace deviascope
