// SPDX-License-Identifier: GPL-2.0-or-later
#include "ensemble/delivery.h"

#include <chrono>
#include <utility>

#include "ensemble/pace.h"
#include "ensemble/rows.h"

namespace deviascope {

Delivery::Delivery(DrawSink& sink, Draws no_rows)
    : sink_(sink), rows_(std::move(no_rows)), rows_together_(sink.rows_together(0)) {}

void Delivery::block(Draws& rows, const EnsembleState& state) {
    settle();
    if (std::exchange(is_first_, false)) rows_together_ = sink_.rows_together(rows.n_rows);
    std::swap(rows, rows_);
    resize_rows(rows, 0);
    state_ = state;
    // Deferred, to when it is waited for, where the system has no thread to give.
    under_way_ = std::async(std::launch::async | std::launch::deferred, [this] {
        const double began = seconds_now();
        sink_.block(rows_, state_);
        return seconds_now() - began;
    });
}

void Delivery::settle() {
    if (!under_way_.valid()) return;
    seconds_to_store_ = under_way_.get();
}

void Delivery::settle_if_done() {
    using std::chrono::seconds;
    if (under_way_.valid() && under_way_.wait_for(seconds(0)) == std::future_status::ready)
        settle();
}

}  // namespace deviascope
