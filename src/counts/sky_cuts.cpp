// SPDX-License-Identifier: GPL-2.0-or-later
#include "counts/sky_cuts.h"

#include <fmt/format.h>

#include <algorithm>

#include "deviascope/core/error.h"

namespace deviascope {

SkyCuts::SkyCuts(const SurveyInput& survey, const Pixelisation& grid, Frame frame)
    : grid_(grid), removed_by_(static_cast<std::size_t>(grid.n_pixels()), kept) {
    if (survey.exposure) {
        survey_map_.emplace_back(*survey.exposure, survey.map_frame, frame);
        survey_maps_.push_back(&survey_map_.front());
    }
    survey_structure_ = deviascope::has_structure_inside_pixels(survey_maps_, grid);
    survey_exposure_ = exposure_on_grid(survey_maps_, grid);
    remove_excluded(survey.exclude, frame);
    const auto exposure_cut = static_cast<std::int32_t>(survey.exclude.size());
    for (std::size_t pixel = 0; pixel < removed_by_.size(); ++pixel)
        if (removed_by_[pixel] == kept && survey_exposure_[pixel] == 0.0)
            removed_by_[pixel] = exposure_cut;
    for (const BinInput& bin : survey.bins) add_bin(survey, bin, frame);
}

/// A pixel goes to the first exclusion, in the job's order, that holds its centre.
void SkyCuts::remove_excluded(const std::vector<Exclusion>& exclude, Frame frame) {
    std::vector<ExclusionTest> tests;
    for (const Exclusion& exclusion : exclude) tests.emplace_back(exclusion, frame);
    if (tests.empty()) return;
    for (std::int64_t pixel = 0; pixel < grid_.n_pixels(); ++pixel) {
        const Direction centre = grid_.centre(pixel);
        const auto first = std::ranges::find_if(
            tests, [&](const ExclusionTest& test) { return test.excludes(centre); });
        if (first != tests.end())
            removed_by_[static_cast<std::size_t>(pixel)] =
                static_cast<std::int32_t>(first - tests.begin());
    }
}

void SkyCuts::add_bin(const SurveyInput& survey, const BinInput& bin, Frame frame) {
    const std::string place = fmt::format("survey {}, bin {}", survey.name, bin.name);
    if (!bin.exposure) {
        own_of_bin_.push_back(nullptr);
        footprint_of_bin_.push_back(add_footprint(survey_exposure_, place));
        return;
    }
    const OwnExposure*& known = own_by_path_[bin.exposure->string()];
    if (known == nullptr) {
        OwnExposure& own = own_.emplace_back(
            OwnExposure{ExposureMap(*bin.exposure, survey.map_frame, frame), false, {}, 0});
        own.structure = deviascope::has_structure_inside_pixels({&own.map}, grid_);
        ExposureProduct maps = survey_maps_;
        maps.push_back(&own.map);
        const std::vector<double> exposure = exposure_on_grid(maps, grid_);
        for (const double w : exposure) own.above_zero.push_back(w > 0.0);
        own.footprint = add_footprint(exposure, place);
        known = &own;
    }
    own_of_bin_.push_back(known);
    footprint_of_bin_.push_back(known->footprint);
}

/// Index of the footprint with this exposure; made where there is none like it yet.
std::size_t SkyCuts::add_footprint(const std::vector<double>& exposure,
                                   const std::string& place) {
    Footprint made;
    for (std::size_t pixel = 0; pixel < exposure.size(); ++pixel) {
        if (removed_by_[pixel] != kept || exposure[pixel] <= 0.0) continue;
        made.pixel.push_back(static_cast<std::int64_t>(pixel));
        made.exposure.push_back(exposure[pixel]);
    }
    if (made.pixel.empty()) {
        throw InputError({place,
                          "no pixel is left by its exclusions and exposure",
                          "at least one pixel with exposure above 0 outside the exclusions",
                          "check the exclusions and the frame of the exposure map"});
    }
    const auto same = std::ranges::find_if(footprints_, [&](const Footprint& other) {
        return other.pixel == made.pixel && other.exposure == made.exposure;
    });
    if (same != footprints_.end()) return static_cast<std::size_t>(same - footprints_.begin());
    footprints_.push_back(std::move(made));
    return footprints_.size() - 1;
}

void SkyCuts::find_holes(std::span<const Direction> positions, std::span<char> is_hole) const {
    find_unexposed(survey_structure_ ? survey_maps_ : ExposureProduct{}, positions, is_hole);
}

bool SkyCuts::exposes(std::size_t bin, std::int64_t pixel, const Direction& direction) const {
    const OwnExposure* own = own_of_bin_[bin];
    if (own == nullptr) return true;
    if (!own->above_zero[static_cast<std::size_t>(pixel)]) return false;
    return !own->structure || own->map.at(direction) > 0.0;
}

ExposureProduct SkyCuts::maps_of_bin(std::size_t bin) const {
    ExposureProduct maps = survey_maps_;
    if (own_of_bin_[bin] != nullptr) maps.push_back(&own_of_bin_[bin]->map);
    return maps;
}

}  // namespace deviascope
