// SPDX-License-Identifier: GPL-2.0-or-later
// COUNTS (private): rows that stop a run
#pragma once

#include <fmt/format.h>

#include <cstdint>
#include <string>

#include "deviascope/core/error.h"
#include "deviascope/counts/survey_input.h"

namespace deviascope {

/// Counts rows with a fault and describes the first five.
class OffendingRows {
  public:
    /// @param describe  called for the first five only: `dunlin.csv line 14 (lon nan, lat 3)`
    template <class Describe>
    void add(Describe describe) {
        if (++n_ > n_described) return;
        if (n_ > 1) first_ += ", ";
        first_ += describe();
    }
    std::int64_t size() const { return n_; }
    /// `12 rows of the catalogue …: first five: …`
    std::string found(const std::string& fault) const {
        return fmt::format("{} {} {}: {}{}",
                           n_,
                           n_ == 1 ? "row has" : "rows have",
                           fault,
                           first_,
                           n_ > n_described ? ", …" : "");
    }

  private:
    static constexpr std::int64_t n_described = 5;
    std::int64_t n_ = 0;
    std::string first_;
};

/// Stops a run where positions are bad and the survey does not say to skip them.
/// Errors: InputError: count and first five.
inline void refuse_bad_positions(const SurveyInput& survey, const OffendingRows& rows) {
    if (rows.size() == 0 || survey.bad_rows == BadRows::skip) return;
    throw InputError({"survey " + survey.name,
                      rows.found("a position that is missing or out of range"),
                      "lon -180 … 360 and lat -90 … 90, in degrees",
                      "correct the rows, or set bad_rows = \"skip\" to leave them out"});
}

}  // namespace deviascope
