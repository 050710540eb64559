// SPDX-License-Identifier: GPL-2.0-or-later
// catalogue -> COUNTS -> model
#pragma once

#include "deviascope/core/progress.h"
#include "deviascope/counts/count_map.h"
#include "deviascope/counts/survey_input.h"
#include "deviascope/sky/position_match.h"

namespace deviascope {

/// Sources of another survey, in the job's frame: what lies within their radius of one is not
/// counted.
struct Duplicates {
    std::string survey;  ///< the other's name
    const PositionIndex* positions = nullptr;
};

/// Counts a survey's sources in the pixels of the job's grid.
///
/// Selection. A pixel is kept when its centre lies outside every exclusion and its exposure is
/// above 0; a source is judged by its pixel, so that sources and pixels are selected alike.
/// Exposure of a pixel: the mean, over its sub-pixels, of the product of the survey's map and
/// the bin's. Sub-pixels are those of the finest map (a coarser one is repeated); where a map
/// is in another frame they are at least the 16 of nside x 4, at whose centres it is read.
/// Where a map is finer than the grid or in another frame, a source is also dropped, and
/// counted as such, where the map is 0 at its own position. UNSEEN, NaN and absent are exposure
/// 0. Positions: lon -180 … 360, lat -90 … 90 degrees, in the survey's frame.
///
/// Table of cuts, in the order in which they act: positions; each range of the survey's
/// `select` (missing values on a line of their own); each exclusion; exposure 0; exposure 0 at
/// the source; missing values of properties that the bins select on (where no other value of
/// that bin fails); in no bin; exposure of a bin 0; in each survey of `duplicates`. Sources of
/// count maps enter it as rows do.
/// @param grid, frame  of the job
/// @param duplicates   surveys that go before this one
/// @param kept         takes the positions of counted catalogue sources, in the job's frame;
///                     null: they are not kept
/// @return counts and a table of cuts that adds up; independent of the order of rows and files
/// Errors: InputError: bad positions (unless skipped), a source in two bins (count, first five
/// rows), a map that does not fit, an exposure outside 0 … 1, a count map in another frame or
/// coarser, with a value that is no count or none where the bin is exposed; no pixel left; more
/// than 2^32 - 1 sources in a pixel; what `progress` throws. Memory: one chunk, maps, counts.
/// Threads: main thread only.
SurveyCounts count_survey(const SurveyInput& survey,
                          const Pixelisation& grid,
                          Frame frame,
                          const Progress& progress,
                          const std::vector<Duplicates>& duplicates = {},
                          std::vector<Direction>* kept = nullptr);

}  // namespace deviascope
