// SPDX-License-Identifier: GPL-2.0-or-later
// summary -> FIGURES -> app
#pragma once

#include <string>
#include <vector>

#include "deviascope/figures/figures.h"

namespace deviascope {

/// The report as one HTML page that needs no network: every warning, then question, data and
/// cuts, result in two sentences, directions, amplitudes, comparison, fit, convergence,
/// provenance; each figure with its reading aid, alternative text and links to
/// `figures/<name>.pdf` and `figures/data/<name>.csv`. Light and dark by the reader's own
/// setting; prints black on white. No time of day is in it: the same job gives the same bytes,
/// whenever it is run.
std::string report_html(const FigureSource& source, const std::vector<Figure>& figures);

}  // namespace deviascope
