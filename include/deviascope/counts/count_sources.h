// SPDX-License-Identifier: GPL-2.0-or-later
// catalogue -> COUNTS -> model
#pragma once

#include "deviascope/core/progress.h"
#include "deviascope/counts/count_map.h"
#include "deviascope/counts/survey_input.h"

namespace deviascope {

/// Counts a survey's sources in the pixels of the job's grid.
///
/// Selection (design section 6): a pixel is kept when its centre lies outside every exclusion
/// and its exposure is above 0; a source is judged by its pixel. With an exposure map finer
/// than the grid a source is dropped (and counted as such) where the fine pixel at its position
/// is 0, and w is the mean of the fine pixels. A coarser map is repeated; a map in another
/// frame is read at the centres of the 16 sub-pixels (nside x 4) of each pixel and averaged.
/// @param grid, frame  of the job
/// @return counts and a table of cuts that adds up; independent of the order of rows and files
/// Errors: InputError: bad positions (unless skipped), a source in two bins (count, first five
/// rows), a map that does not fit, an exposure outside 0 … 1, a bin map in another frame or
/// coarser. Memory: one chunk of rows, the maps, the counts.
SurveyCounts count_survey(const SurveyInput& survey,
                          const Pixelisation& grid,
                          Frame frame,
                          const Progress& progress);

}  // namespace deviascope
