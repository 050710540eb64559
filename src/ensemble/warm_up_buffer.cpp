// SPDX-License-Identifier: GPL-2.0-or-later
#include "ensemble/warm_up_buffer.h"

#include <algorithm>

#include "ensemble/rows.h"

namespace deviascope {

namespace {

/// Moves rows 1, 3, 5 … of a column of equal rows to the front.
template <class Array>
void keep_every_second(Array& value, Eigen::Index n_rows) {
    const auto width = static_cast<std::ptrdiff_t>(value.size()) / n_rows;
    for (Eigen::Index row = 1; row < n_rows; row += 2)
        std::copy_n(value.begin() + row * width, width, value.begin() + row / 2 * width);
}

}  // namespace

WarmUpBuffer::WarmUpBuffer(Draws empty) : draws_(std::move(empty)) {
    reserve_rows(draws_, most_rows);
}

std::vector<std::int64_t> WarmUpBuffer::steps() const {
    std::vector<std::int64_t> step(static_cast<std::size_t>(draws_.n_rows));
    for (std::size_t row = 0; row < step.size(); ++row)
        step[row] = static_cast<std::int64_t>(row + 1) * spacing_;
    return step;
}

void WarmUpBuffer::make_room() {
    if (draws_.n_rows < most_rows) return;
    keep_every_second(draws_.value, draws_.n_rows);
    keep_every_second(draws_.log_posterior, draws_.n_rows);
    keep_every_second(draws_.log_likelihood, draws_.n_rows);
    resize_rows(draws_, draws_.n_rows / 2);
    spacing_ *= 2;
}

void WarmUpBuffer::extend_to(std::int64_t step) {
    resize_rows(draws_, step / spacing_);
}

}  // namespace deviascope
