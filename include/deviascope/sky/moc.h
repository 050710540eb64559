// SPDX-License-Identifier: GPL-2.0-or-later
// SKY: where things are, no sources
#pragma once

#include <cstdint>
#include <filesystem>
#include <optional>
#include <vector>

#include "deviascope/sky/direction.h"
#include "deviascope/sky/frame.h"

namespace deviascope {

/// A region of sky as a Multi-Order Coverage map: HEALPix pixels of several orders (order =
/// log2 nside), kept as the NESTED numbers they hold at the deepest order.
/// Source: MOC 2.0, IVOA Recommendation 2022-07-27.
class Moc {
  public:
    static constexpr int deepest_order = 29;
    /// Pixels [begin, end) of the deepest order, NESTED.
    struct Range {
        std::int64_t begin = 0, end = 0;
        bool operator==(const Range&) const = default;
    };

    Moc() = default;
    /// @param ranges  in any order, overlaps allowed
    /// Errors: InternalError unless 0 <= begin < end <= 12 4^29 in each.
    explicit Moc(std::vector<Range> ranges);

    /// Ascending; neither overlapping nor touching.
    const std::vector<Range>& ranges() const { return ranges_; }
    /// The lowest order whose pixels make up the region exactly; 0 where it is empty.
    int order() const;
    /// 0 … 1.
    double sky_fraction() const;
    /// Whether the region holds a direction of its frame. A direction on the edge of a pixel is
    /// in that which HEALPix says. Errors: InternalError unless it is a unit vector.
    bool contains(const Direction& direction) const;
    /// The share of a pixel that the region covers, 0 … 1.
    /// @param nested  NESTED number at `order`, 0 … 29
    double share_of(std::int64_t nested, int order) const;

  private:
    std::vector<Range> ranges_;
};

/// A MOC file: the region, and its frame where the header names one.
struct MocFile {
    Moc region;
    std::optional<Frame> frame;  ///< COORDSYS; a MOC without it is in ICRS by the standard
};

/// Whether a FITS file's first table with a card ORDERING says NUNIQ or RANGE.
/// Errors: InputError where the file is no FITS file.
bool is_moc(const std::filesystem::path& path);

/// Reads a space MOC: versions 1.x and 2.0, ORDERING NUNIQ (numbers 4 x 4^order + index) or
/// RANGE (starts and ends at order 29).
/// Errors: InputError: no MOC, of time, a number out of range, a range that ends before it
/// begins. Threads: main thread only.
MocFile read_moc(const std::filesystem::path& path);

/// Writes a MOC 2.0 file in ICRS, ORDERING NUNIQ (which readers of version 1.1 know too): four
/// siblings stand as their parent. Errors: OutputError.
void write_moc(const std::filesystem::path& path, const Moc& region);

}  // namespace deviascope
