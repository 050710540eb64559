// SPDX-License-Identifier: GPL-2.0-or-later
// ENSEMBLE, inside: blocks of rows on their way to the sink
#pragma once

#include <future>

#include "deviascope/ensemble/draws.h"

namespace deviascope {

/// Hands blocks to a sink on a thread of its own, one at a time and in order, so that sampling
/// goes on while the disk is waited for. What the sink makes of them cannot depend on that.
class Delivery {
  public:
    /// @param no_rows  draws of the shape that is to be delivered
    Delivery(DrawSink& sink, Draws no_rows);
    /// Waits for the sink; an error that nobody asked for is lost.
    ~Delivery() = default;

    /// Waits. Errors: the sink's.
    void warm_up(const WarmUp& warm_up) { sink_.warm_up(warm_up); }
    /// Waits for the block before. Takes the rows, and leaves none in memory that can be used
    /// again. With the first it is settled how many rows go well together.
    /// Errors: the sink's, about this block or the one before.
    void block(Draws& rows, const EnsembleState& state);
    /// Waits until all is delivered. Errors: the sink's.
    void settle();
    /// Settles if that needs no waiting.
    void settle_if_done();

    std::int64_t rows_together() const { return rows_together_; }
    /// What the last block took that is settled.
    double seconds_to_store() const { return seconds_to_store_; }

  private:
    DrawSink& sink_;
    Draws rows_;  ///< being delivered, like `state_`
    EnsembleState state_;
    bool is_first_ = true;
    std::int64_t rows_together_;
    double seconds_to_store_ = 0.0;
    std::future<double> under_way_;  ///< goes first, and waits for what uses the rest
};

}  // namespace deviascope
