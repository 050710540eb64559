// SPDX-License-Identifier: GPL-2.0-or-later
// summary -> FIGURES -> app
#pragma once

#include <filesystem>
#include <optional>
#include <string>
#include <vector>

#include "deviascope/chain/chain.h"
#include "deviascope/core/error.h"
#include "deviascope/model/parameter_space.h"
#include "deviascope/summary/comparison.h"
#include "deviascope/summary/direction_density.h"
#include "deviascope/summary/summary.h"

namespace deviascope {

/// What figures are made from. References must outlive the call.
struct FigureSource {
    const Chain& chain;
    const ParameterSpace& space;
    const Summary& summary;
    /// As direction_densities() makes them: one a vector of the chain.
    const std::vector<std::optional<DirectionDensity>>& directions;
    Eigen::Vector3d cmb_velocity;  ///< mean of the cmb-velocity prior, job's frame, units of c
    std::uint64_t seed = 0;        ///< of the job
    /// Of the same job and inputs, where it has been made; else null.
    const Comparison* comparison = nullptr;
};

struct FigureOptions {
    double width_mm = 180.0;              ///< 80 … 200; a column is 90, a page 180
    bool bare = false;                    ///< no titles
    std::filesystem::path font;           ///< in place of Open Sans; empty: that
    std::vector<std::string> only;        ///< names or their beginnings; empty: all
    std::vector<std::string> parameters;  ///< of the joint figure; empty: vector components
    int threads = 1;

    /// Rules that are broken.
    std::vector<Message> problems() const;
};

/// What the names of figures begin with, in the report's order.
std::vector<std::string> figure_kinds();

/// Whether figures can be drawn at all. Errors: OutputError where no font is found, UsageError
/// where `own` is none.
void require_fonts(const std::filesystem::path& own);

/// Names and versions of the libraries that draw, on one line.
std::string drawing_library_versions();

/// A figure in every form it is written in.
struct Figure {
    std::string name;         ///< of its files, for instance `directions`
    std::string title;        ///< a few words
    std::string reading_aid;  ///< one line: how to read it
    std::string alternative;  ///< the numbers in words, for who cannot see it
    std::string svg, pdf, png;
    std::string inlined_svg;  ///< for the report: ids begin with the name, colours by property
    std::string csv;          ///< the data behind it
};

/// All figures that the chain gives rise to, in the order of the report: directions,
/// residuals-<survey>, amplitudes, joint (or joint-<vector>, where a page has no room for all),
/// hypotheses and surveys (of a comparison), profile-<survey>, weights, traces. The same input
/// gives the same bytes, for any threads.
///
/// Errors: UsageError: options.problems(); a name in `only` that no figure begins with; a
/// parameter that does not exist, does not vary, or one too many for the page. OutputError
/// where no font is found.
std::vector<Figure> make_figures(const FigureSource& source, const FigureOptions& options);

}  // namespace deviascope
