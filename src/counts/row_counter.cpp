// SPDX-License-Identifier: GPL-2.0-or-later
#include "counts/row_counter.h"

#include <fmt/format.h>

#include "deviascope/core/error.h"

namespace deviascope {

namespace {

constexpr std::size_t none = static_cast<std::size_t>(-1);

/// Comparisons that NaN fails.
bool is_position(double lon_deg, double lat_deg) {
    return lon_deg >= -180.0 && lon_deg <= 360.0 && lat_deg >= -90.0 && lat_deg <= 90.0;
}

}  // namespace

RowCounter::RowCounter(const Selection& selection,
                       CutTable& cuts,
                       std::vector<BinTally>& tallies)
    : selection_(selection),
      to_job_(rotation(selection.input.frame, selection.frame)),
      cuts_(cuts),
      tallies_(tallies) {}

void RowCounter::add(const TableChunk& chunk,
                     const std::filesystem::path& path,
                     const TableReader& reader) {
    first_row_ = chunk.first_row;
    path_ = &path;
    reader_ = &reader;
    locate(chunk);
    const auto n_rows = static_cast<std::size_t>(chunk.n_rows());
    for (std::size_t row = 0; row < n_rows; ++row) {
        const std::size_t cut = cut_of(chunk, row);
        if (cut == none) {
            ++cuts_.report.rows_kept;
        } else {
            cuts_.remove_rows(cut);
        }
    }
    cuts_.report.rows_read += chunk.n_rows();
}

/// Directions in the job's frame and pixels of all rows of the chunk.
void RowCounter::locate(const TableChunk& chunk) {
    const std::vector<double>& lon = chunk.column[selection_.rows.lon];
    const std::vector<double>& lat = chunk.column[selection_.rows.lat];
    direction_.resize(lon.size());
    pixel_.resize(lon.size());
    is_bad_.resize(lon.size());
    for (std::size_t row = 0; row < lon.size(); ++row) {
        is_bad_[row] = !is_position(lon[row], lat[row]);
        direction_[row] = Direction::UnitX();
        if (!is_bad_[row]) direction_[row] = to_job_ * direction_of(lon[row], lat[row]);
    }
    selection_.grid.pixels_at(direction_, pixel_);
}

/// The line of the table of cuts that removes a row; none: the row is counted.
std::size_t RowCounter::cut_of(const TableChunk& chunk, std::size_t row) {
    if (is_bad_[row]) {
        bad_positions_.add([&] {
            return fmt::format("{} (lon {}, lat {})",
                               place(row),
                               chunk.column[selection_.rows.lon][row],
                               chunk.column[selection_.rows.lat][row]);
        });
        return cuts_.position;
    }
    const Verdict verdict = judge(selection_.rows.survey, chunk, row);
    if (verdict.kind == Verdict::Kind::outside) return cuts_.select[verdict.range];
    if (verdict.kind == Verdict::Kind::missing)
        return cuts_.missing[selection_.rows.survey[verdict.range].property];
    const std::int32_t sky_cut = selection_.sky.removed_by(pixel_[row]);
    if (sky_cut != SkyCuts::kept)
        return cuts_.first_sky_cut + static_cast<std::size_t>(sky_cut);
    if (selection_.sky.has_hole_at(direction_[row])) return cuts_.hole;
    return cut_by_bins(chunk, row);
}

/// Counts a row of a kept pixel in its bin; else says what removes it.
std::size_t RowCounter::cut_by_bins(const TableChunk& chunk, std::size_t row) {
    std::size_t home = none;
    std::size_t missing = none;
    std::size_t unexposed = none;
    for (const std::size_t bin : selection_.rows.selecting_bins) {
        const std::vector<ColumnRange>& ranges = selection_.rows.bins[bin];
        const Verdict verdict = judge(ranges, chunk, row);
        if (verdict.kind == Verdict::Kind::outside) continue;
        if (verdict.kind == Verdict::Kind::missing) {
            if (missing == none) missing = cuts_.missing[ranges[verdict.range].property];
        } else if (!selection_.sky.exposes(bin, pixel_[row], direction_[row])) {
            if (unexposed == none) unexposed = cuts_.bin_exposure[bin];
        } else if (home == none) {
            home = bin;
        } else {
            in_two_bins_.add([&] {
                const auto& bins = selection_.input.bins;
                return fmt::format(
                    "{} ({} and {})", place(row), bins[home].name, bins[bin].name);
            });
            break;
        }
    }
    if (home != none) {
        tallies_[home].add(pixel_[row]);
        return none;
    }
    if (unexposed != none) return unexposed;
    return missing != none ? missing : cuts_.no_bin;
}

std::string RowCounter::place(std::size_t row) const {
    return fmt::format("{} {}",
                       path_->filename().string(),
                       reader_->place_of_row(first_row_ + static_cast<std::int64_t>(row)));
}

void RowCounter::refuse_offending_rows() const {
    const std::string survey = "survey " + selection_.input.name;
    if (bad_positions_.size() > 0 && selection_.input.bad_rows == BadRows::stop) {
        throw InputError({survey,
                          bad_positions_.found("a position that is missing or out of range"),
                          "lon -180 … 360 and lat -90 … 90, in degrees",
                          "correct the rows, or set bad_rows = \"skip\" to leave them out"});
    }
    if (in_two_bins_.size() > 0) {
        throw InputError(
            {survey,
             in_two_bins_.found("a place in two bins"),
             "bins of one survey share no source",
             "make the ranges of the bins disjoint: they are half-open, [lo, hi)"});
    }
}

}  // namespace deviascope
