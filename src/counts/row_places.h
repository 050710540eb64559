// SPDX-License-Identifier: GPL-2.0-or-later
// COUNTS (private): where the rows of a catalogue are, and what the sky removes of them
#pragma once

#include <Eigen/Core>
#include <cstdint>
#include <vector>

#include "counts/row_selection.h"
#include "counts/sky_cuts.h"

namespace deviascope {

/// What rows are judged by.
struct Selection {
    const SurveyInput& input;
    const RowSelection& rows;
    const SkyCuts& sky;
    const Pixelisation& grid;
    Frame frame;
};

/// Places of the rows of one chunk after another.
class RowPlaces {
  public:
    explicit RowPlaces(const Selection& selection);

    void locate(const TableChunk& chunk);

    /// Whether a position is missing or out of range: lon -180 … 360, lat -90 … 90 degrees.
    bool is_bad(std::size_t row) const { return is_bad_[row] != 0; }
    /// Whether the survey's exposure is 0 at the position itself.
    bool is_hole(std::size_t row) const { return is_hole_[row] != 0; }
    /// In the job's frame; arbitrary where the position is bad.
    const Direction& direction(std::size_t row) const { return direction_[row]; }
    std::int64_t pixel(std::size_t row) const { return pixel_[row]; }
    /// What the sky removes it by (SkyCuts::removed_by).
    std::int32_t sky_cut(std::size_t row) const {
        return selection_.sky.removed_by(pixel_[row]);
    }

  private:
    const Selection selection_;
    const Eigen::Matrix3d to_job_;
    std::vector<Direction> direction_;
    std::vector<std::int64_t> pixel_;
    std::vector<char> is_bad_;
    std::vector<char> is_hole_;
};

}  // namespace deviascope
