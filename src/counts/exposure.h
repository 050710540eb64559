// SPDX-License-Identifier: GPL-2.0-or-later
// COUNTS (private): exposure maps on the job's grid
#pragma once

#include <Eigen/Core>
#include <filesystem>
#include <optional>
#include <span>
#include <vector>

#include "deviascope/sky/healpix_map.h"
#include "deviascope/sky/pixelisation.h"

namespace deviascope {

/// One exposure map, asked in the job's frame. What is absent in the file is exposure 0.
class ExposureMap {
  public:
    /// Errors: InputError: a map that cannot be read, that says nothing or two things about its
    /// frame, or with a value outside 0 … 1.
    ExposureMap(const std::filesystem::path& path,
                std::optional<Frame> map_frame,
                Frame job_frame);

    const std::filesystem::path& path() const { return path_; }
    int nside() const { return cells_.nside(); }
    bool is_in_job_frame() const { return in_job_frame_; }

    /// Exposure 0 … 1 of the map's pixel that holds a direction of the job's frame.
    double at(const Direction& direction) const;
    /// Sets `zero` to 1 where the exposure at a direction is 0; leaves the rest.
    void mark_zero(std::span<const Direction> directions, std::span<char> zero) const;
    /// Exposure of pixel `cell` of a grid that is as fine as the map or finer, in the job's
    /// frame: the value of the map's pixel that holds it, or its centre where frames differ.
    double in_cell(std::int64_t cell, const Pixelisation& cells) const;

  private:
    std::filesystem::path path_;
    bool in_job_frame_ = true;
    Eigen::Matrix3d to_map_;
    Pixelisation cells_;
    std::vector<double> value_;  // 12 nside^2, RING
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
