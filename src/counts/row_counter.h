// SPDX-License-Identifier: GPL-2.0-or-later
// COUNTS (private): rows of a catalogue to counts
#pragma once

#include <filesystem>
#include <vector>

#include "counts/bin_tally.h"
#include "counts/cut_table.h"
#include "counts/offending_rows.h"
#include "counts/position_watch.h"
#include "counts/row_places.h"
#include "deviascope/counts/count_sources.h"

namespace deviascope {

/// Judges rows, chunk after chunk, and counts those that are kept in the bin they fall in.
class RowCounter {
  public:
    /// @param cuts, tallies  are added to; tallies: n_bins
    /// @param duplicates, kept  as in `count_survey`
    RowCounter(const Selection& selection,
               CutTable& cuts,
               std::vector<BinTally>& tallies,
               const std::vector<Duplicates>& duplicates,
               std::vector<Direction>* kept);

    /// @param path, reader  the chunk came from, for messages
    void add(const TableChunk& chunk,
             const std::filesystem::path& path,
             const TableReader& reader);

    /// What is suspicious about the positions, in plain sentences.
    std::vector<std::string> suspicions() const { return positions_.suspicions(); }

    /// Errors: InputError: rows with bad positions (unless they are to be skipped), or in two
    /// bins; count and first five.
    void refuse_offending_rows() const;

  private:
    void watch_positions(const TableChunk& chunk);
    void find_bins(const TableChunk& chunk);
    std::size_t cut_of(const TableChunk& chunk, std::size_t row);
    std::size_t cut_by_bins(const TableChunk& chunk, std::size_t row);
    std::size_t cut_of_homeless(const TableChunk& chunk, std::size_t row) const;
    std::size_t duplicate_of(std::size_t row) const;
    std::size_t exposed_bin(const TableChunk& chunk, std::size_t row);
    std::string place(std::size_t row) const;

    const Selection selection_;
    RowPlaces places_;
    CutTable& cuts_;
    std::vector<BinTally>& tallies_;
    const std::vector<Duplicates>& duplicates_;
    std::vector<Direction>* kept_;
    PositionWatch positions_;
    OffendingRows bad_positions_;
    OffendingRows in_two_bins_;

    // of the chunk at hand
    std::vector<std::int32_t> n_bins_;  // whose ranges hold the row
    std::vector<std::int32_t> bin_;     // the last of these
    std::int64_t first_row_ = 0;
    const std::filesystem::path* path_ = nullptr;
    const TableReader* reader_ = nullptr;
};

}  // namespace deviascope
