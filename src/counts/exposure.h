// SPDX-License-Identifier: GPL-2.0-or-later
// COUNTS (private): exposure maps on the job's grid
#pragma once

#include <Eigen/Core>
#include <filesystem>
#include <optional>
#include <span>
#include <vector>

#include "deviascope/sky/healpix_map.h"
#include "deviascope/sky/moc.h"
#include "deviascope/sky/pixelisation.h"

namespace deviascope {

/// One exposure map, asked in the job's frame: a HEALPix map, in which what is absent is
/// exposure 0, or a MOC, whose inside is 1 and outside 0.
class ExposureMap {
  public:
    /// Errors: InputError: a map that cannot be read, that says nothing or two things about its
    /// frame (a MOC that says nothing is in ICRS), or with a value outside 0 … 1.
    ExposureMap(const std::filesystem::path& path,
                std::optional<Frame> map_frame,
                Frame job_frame);

    const std::filesystem::path& path() const { return path_; }
    /// Of its pixels; of a MOC at most 1024, finer pixels of it count by their share.
    int nside() const { return cells_.nside(); }
    bool is_in_job_frame() const { return in_job_frame_; }
    /// Whether it may change inside a pixel of this grid.
    bool is_finer_than(const Pixelisation& grid) const;

    /// Exposure 0 … 1 of the map's pixel that holds a direction of the job's frame.
    double at(const Direction& direction) const;
    /// Sets `zero` to 1 where the exposure at a direction is 0; leaves the rest.
    void mark_zero(std::span<const Direction> directions, std::span<char> zero) const;
    /// Exposure of pixel `cell` of a grid that is as fine as the map or finer, in the job's
    /// frame: the value of the map's pixel that holds it, or its centre where frames differ; of
    /// a MOC in the job's frame the share of the cell that it covers.
    double in_cell(std::int64_t cell, const Pixelisation& cells) const;

  private:
    void take_region(const MocFile& file);
    void take_map(HealpixMap map);
    Direction in_map(const Direction& direction) const;

    std::filesystem::path path_;
    bool in_job_frame_ = true;
    Eigen::Matrix3d to_map_;
    Pixelisation cells_;
    std::vector<double> value_;  // 12 nside^2, RING; empty for a MOC
    std::optional<Moc> region_;
    int order_ = 0;  // of the MOC, or of the map's pixels
};

/// Maps whose product is the exposure of a bin, or of a survey. Not owned.
using ExposureProduct = std::vector<const ExposureMap*>;

/// Exposure of each pixel of the job's grid: the mean, over its sub-pixels, of the product of
/// the maps there. Sub-pixels: those of the finest map; where a map is in another frame, at
/// least the 16 of nside x 4, at whose centres it is read.
/// @return n_pixels, 0 … 1; all 1 where there is no map
std::vector<double> exposure_on_grid(const ExposureProduct& maps, const Pixelisation& grid);

/// True where the product may be 0 at a place inside a pixel whose mean exposure is above 0, so
/// that sources must be judged by their own position.
bool has_structure_inside_pixels(const ExposureProduct& maps, const Pixelisation& grid);

/// Says of each direction of the job's frame whether the product is 0 there: 1, else 0.
/// @param unexposed  as long as `directions`
void find_unexposed(const ExposureProduct& maps,
                    std::span<const Direction> directions,
                    std::span<char> unexposed);

}  // namespace deviascope
