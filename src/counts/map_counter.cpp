// SPDX-License-Identifier: GPL-2.0-or-later
#include "counts/map_counter.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "counts/map_frame.h"
#include "deviascope/core/error.h"

namespace deviascope {

namespace {

constexpr std::size_t none = static_cast<std::size_t>(-1);

HealpixMap read_count_map(const Selection& selection, const std::filesystem::path& path) {
    if (is_moc(path))
        throw InputError({path.string(),
                          "this is a MOC",
                          "a HEALPix map of numbers of sources",
                          "a MOC may be given as exposure"});
    HealpixMap map = read_healpix_map(path);
    const Frame frame = frame_of_map(path, map.frame, selection.input.map_frame);
    if (frame != selection.frame) {
        throw InputError({path.string(),
                          fmt::format("the count map is in the {} frame", name_of(frame)),
                          fmt::format("the frame of the job, {}", name_of(selection.frame)),
                          "count the sources anew in that frame, or set job.frame"});
    }
    if (map.nside < selection.grid.nside()) {
        throw InputError({path.string(),
                          fmt::format("the count map has nside {}", map.nside),
                          fmt::format("at least the {} of the job", selection.grid.nside()),
                          "choose a smaller job.nside, or count with more pixels"});
    }
    return map;
}

/// A value as a number of sources. Errors: InputError.
std::int64_t checked_count(double value, const std::filesystem::path& path, std::int64_t cell) {
    constexpr double largest = 9007199254740992.0;  // 2^53: beyond, doubles skip integers
    if (value >= 0.0 && value <= largest && value == std::floor(value))
        return static_cast<std::int64_t>(value);
    throw InputError(
        {fmt::format("{}: pixel {} (RING)", path.string(), cell),
         std::isnan(value) ? std::string("there is no count where the bin is exposed")
                           : fmt::format("the count is {}", value),
         "a whole number, 0 or more",
         std::isnan(value) ? "write 0 where no source was found; mask what was not observed"
                           : "a count map holds numbers of sources; give no densities"});
}

/// The line of the table of cuts that removes sources of a bin there; none: they are counted.
std::size_t cut_at(const Selection& selection,
                   const CutTable& cuts,
                   std::size_t bin,
                   std::int64_t pixel,
                   const Direction& centre,
                   bool is_hole) {
    const std::int32_t sky_cut = selection.sky.removed_by(pixel);
    if (sky_cut != SkyCuts::kept) return cuts.first_sky_cut + static_cast<std::size_t>(sky_cut);
    if (is_hole) return cuts.hole;
    return selection.sky.exposes(bin, pixel, centre) ? none : cuts.bin_exposure[bin];
}

void warn_of_unresolved_holes(const Selection& selection,
                              std::size_t bin,
                              const Pixelisation& cells,
                              CutTable& cuts) {
    if (!has_structure_inside_pixels(selection.sky.maps_of_bin(bin), cells)) return;
    cuts.report.warnings.push_back(fmt::format(
        "bin {}: its exposure is finer than its count map, or in another frame; sources of the "
        "count map are judged at the centres of its pixels",
        selection.input.bins[bin].name));
}

/// A bin's count map and what its sources are judged by.
struct MapOfBin {
    const Selection& selection;
    std::size_t bin;
    const HealpixMap& map;
    const Pixelisation& cells;
};

/// Judges and counts the sources of the map's pixels [first, end).
void count_cells(
    const MapOfBin& of, std::int64_t first, std::int64_t end, CutTable& cuts, BinTally& tally) {
    std::vector<Direction> centre;
    for (std::int64_t cell = first; cell < end; ++cell) centre.push_back(of.cells.centre(cell));
    std::vector<char> is_hole(centre.size());
    of.selection.sky.find_holes(centre, is_hole);
    for (std::int64_t cell = first; cell < end; ++cell) {
        const auto at = static_cast<std::size_t>(cell - first);
        const double value = of.map.value[static_cast<std::size_t>(cell)];
        const std::int64_t pixel = of.cells.parent(cell, of.selection.grid);
        const std::size_t cut =
            cut_at(of.selection, cuts, of.bin, pixel, centre[at], is_hole[at] != 0);
        if (std::isnan(value) && cut != none) continue;
        const std::filesystem::path& path = *of.selection.input.bins[of.bin].counts;
        const std::int64_t n = checked_count(value, path, cell);
        cuts.report.rows_read += n;
        if (cut != none) {
            cuts.remove_rows(cut, n);
        } else {
            cuts.report.rows_kept += n;
            tally.add(pixel, n);
        }
    }
}

}  // namespace

void count_map_sources(const Selection& selection,
                       std::size_t bin,
                       CutTable& cuts,
                       BinTally& tally) {
    const std::filesystem::path& path = *selection.input.bins[bin].counts;
    const HealpixMap map = read_count_map(selection, path);
    const Pixelisation cells(map.nside);
    warn_of_unresolved_holes(selection, bin, cells, cuts);
    constexpr std::int64_t block = 16384;  // maps are large, lists of centres larger
    for (std::int64_t first = 0; first < cells.n_pixels(); first += block) {
        const std::int64_t end = std::min(first + block, cells.n_pixels());
        count_cells({selection, bin, map, cells}, first, end, cuts, tally);
    }
}

}  // namespace deviascope
