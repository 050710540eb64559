// SPDX-License-Identifier: GPL-2.0-or-later
#include "counts/row_counter.h"

#include <fmt/format.h>

#include <algorithm>

#include "deviascope/core/error.h"

namespace deviascope {

namespace {

constexpr std::size_t none = static_cast<std::size_t>(-1);

}  // namespace

RowCounter::RowCounter(const Selection& selection,
                       CutTable& cuts,
                       std::vector<BinTally>& tallies,
                       const std::vector<Duplicates>& duplicates,
                       std::vector<Direction>* kept)
    : selection_(selection),
      places_(selection),
      cuts_(cuts),
      tallies_(tallies),
      duplicates_(duplicates),
      kept_(kept) {}

void RowCounter::add(const TableChunk& chunk,
                     const std::filesystem::path& path,
                     const TableReader& reader) {
    first_row_ = chunk.first_row;
    path_ = &path;
    reader_ = &reader;
    places_.locate(chunk);
    watch_positions(chunk);
    find_bins(chunk);
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

void RowCounter::watch_positions(const TableChunk& chunk) {
    const std::vector<double>& lon = chunk.column[selection_.rows.lon];
    const std::vector<double>& lat = chunk.column[selection_.rows.lat];
    for (std::size_t row = 0; row < lon.size(); ++row)
        if (!places_.is_bad(row)) positions_.add(lon[row], lat[row]);
}

/// Which bins the rows of the chunk fall in, column after column.
void RowCounter::find_bins(const TableChunk& chunk) {
    const auto n_rows = static_cast<std::size_t>(chunk.n_rows());
    n_bins_.assign(n_rows, 0);
    bin_.assign(n_rows, 0);
    std::vector<std::int32_t> inside(n_rows);
    for (const std::size_t bin : selection_.rows.selecting_bins) {
        std::ranges::fill(inside, 1);
        for (const ColumnRange& range : selection_.rows.bins[bin]) {
            const double* value = chunk.column[range.column].data();
            for (std::size_t row = 0; row < n_rows; ++row)
                inside[row] &= std::int32_t{value[row] >= range.low} &
                               std::int32_t{value[row] < range.high};
        }
        const auto number = static_cast<std::int32_t>(bin);
        for (std::size_t row = 0; row < n_rows; ++row) {
            n_bins_[row] += inside[row];
            bin_[row] = inside[row] != 0 ? number : bin_[row];
        }
    }
}

/// The line of the table of cuts that removes a row; none: the row is counted.
std::size_t RowCounter::cut_of(const TableChunk& chunk, std::size_t row) {
    if (places_.is_bad(row)) {
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
    const std::int32_t sky_cut = places_.sky_cut(row);
    if (sky_cut != SkyCuts::kept)
        return cuts_.first_sky_cut + static_cast<std::size_t>(sky_cut);
    if (places_.is_hole(row)) return cuts_.hole;
    return cut_by_bins(chunk, row);
}

/// Counts a row of a kept pixel in its bin; else says what removes it.
std::size_t RowCounter::cut_by_bins(const TableChunk& chunk, std::size_t row) {
    if (n_bins_[row] == 0) return cut_of_homeless(chunk, row);
    const std::size_t bin =
        n_bins_[row] == 1 ? static_cast<std::size_t>(bin_[row]) : exposed_bin(chunk, row);
    if (!selection_.sky.exposes(bin, places_.pixel(row), places_.direction(row)))
        return cuts_.bin_exposure[bin];
    const std::size_t duplicate = duplicate_of(row);
    if (duplicate != none) return cuts_.duplicate[duplicate];
    if (kept_ != nullptr) kept_->push_back(places_.direction(row));
    tallies_[bin].add(places_.pixel(row));
    return none;
}

/// The first survey that has the source too; none: no other has it.
std::size_t RowCounter::duplicate_of(std::size_t row) const {
    for (std::size_t other = 0; other < duplicates_.size(); ++other)
        if (duplicates_[other].positions->has_neighbour(places_.direction(row))) return other;
    return none;
}

/// The line of a row in no bin: a value is missing where no other value fails, or none fits.
std::size_t RowCounter::cut_of_homeless(const TableChunk& chunk, std::size_t row) const {
    for (const std::size_t bin : selection_.rows.selecting_bins) {
        const std::vector<ColumnRange>& ranges = selection_.rows.bins[bin];
        const Verdict verdict = judge(ranges, chunk, row);
        if (verdict.kind == Verdict::Kind::missing)
            return cuts_.missing[ranges[verdict.range].property];
    }
    return cuts_.no_bin;
}

/// Of several bins whose ranges hold a row, the first that is exposed there (else the first);
/// a second one is noted as a fault.
std::size_t RowCounter::exposed_bin(const TableChunk& chunk, std::size_t row) {
    std::size_t first = none;
    std::size_t home = none;
    for (const std::size_t bin : selection_.rows.selecting_bins) {
        if (!holds(selection_.rows.bins[bin], chunk, row)) continue;
        if (first == none) first = bin;
        if (!selection_.sky.exposes(bin, places_.pixel(row), places_.direction(row))) continue;
        if (home == none) {
            home = bin;
            continue;
        }
        in_two_bins_.add([&] {
            const auto& bins = selection_.input.bins;
            return fmt::format("{} ({} and {})", place(row), bins[home].name, bins[bin].name);
        });
        break;
    }
    return home == none ? first : home;
}

std::string RowCounter::place(std::size_t row) const {
    return fmt::format("{} {}",
                       path_->filename().string(),
                       reader_->place_of_row(first_row_ + static_cast<std::int64_t>(row)));
}

void RowCounter::refuse_offending_rows() const {
    refuse_bad_positions(selection_.input, bad_positions_);
    if (in_two_bins_.size() > 0) {
        throw InputError(
            {"survey " + selection_.input.name,
             in_two_bins_.found("a place in two bins"),
             "bins of one survey share no source",
             "make the ranges of the bins disjoint: they are half-open, [lo, hi)"});
    }
}

}  // namespace deviascope
