// SPDX-License-Identifier: GPL-2.0-or-later
// COUNTS (private): which pixels a survey and its bins keep
#pragma once

#include <cstdint>
#include <deque>
#include <map>
#include <span>
#include <string>
#include <vector>

#include "counts/exposure.h"
#include "deviascope/counts/count_map.h"
#include "deviascope/counts/survey_input.h"

namespace deviascope {

/// The part of the selection that looks at places on the sky and at no property of a source:
/// exclusions in the job's order, then the survey's exposure, then the exposure of a bin.
class SkyCuts {
  public:
    static constexpr std::int32_t kept = -1;

    /// Reads the maps. Errors: InputError: a map that does not fit; no pixel left.
    SkyCuts(const SurveyInput& survey, const Pixelisation& grid, Frame frame);

    /// What removes a pixel from the survey: the number of the exclusion that does so first,
    /// the number of exclusions for exposure 0, or `kept`.
    std::int32_t removed_by(std::int64_t pixel) const {
        return removed_by_[static_cast<std::size_t>(pixel)];
    }
    /// The same for all pixels, in RING order.
    const std::vector<std::int32_t>& removed_by() const { return removed_by_; }

    /// Says of each position whether the survey's exposure is 0 there although its pixel may be
    /// kept: 1, else 0.
    void find_holes(std::span<const Direction> positions, std::span<char> is_hole) const;

    /// True where a bin's own exposure is above 0 at a position inside a kept pixel.
    bool exposes(std::size_t bin, std::int64_t pixel, const Direction& direction) const;
    /// Maps that decide about a bin: the survey's, the bin's.
    ExposureProduct maps_of_bin(std::size_t bin) const;

    /// Footprints, each different, and the index of the one of each bin.
    const std::vector<Footprint>& footprints() const { return footprints_; }
    std::size_t footprint_of_bin(std::size_t bin) const { return footprint_of_bin_[bin]; }

  private:
    void remove_excluded(const std::vector<Exclusion>& exclude, Frame frame);
    void add_bin(const SurveyInput& survey, const BinInput& bin, Frame frame);
    std::size_t add_footprint(const std::vector<double>& exposure, const std::string& place);

    /// A bin's own exposure; shared by the bins that name the same file.
    struct OwnExposure {
        ExposureMap map;
        bool structure = false;        // of the map inside pixels
        std::vector<bool> above_zero;  // n_pixels: of the product with the survey's exposure
        std::size_t footprint = 0;
    };

    Pixelisation grid_;
    std::deque<ExposureMap> survey_map_;  // none or one
    ExposureProduct survey_maps_;
    std::deque<OwnExposure> own_;  // of bins; a deque keeps addresses
    std::map<std::string, const OwnExposure*> own_by_path_;
    std::vector<const OwnExposure*> own_of_bin_;  // null: none
    bool survey_structure_ = false;
    std::vector<std::int32_t> removed_by_;  // n_pixels
    std::vector<double> survey_exposure_;   // n_pixels
    std::vector<Footprint> footprints_;
    std::vector<std::size_t> footprint_of_bin_;
};

}  // namespace deviascope
