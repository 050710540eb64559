// SPDX-License-Identifier: GPL-2.0-or-later
// FIGURES, inside: a parameter of the chain, or an amplitude, as figures show it
#pragma once

#include <optional>
#include <string>
#include <vector>

#include "deviascope/summary/interval.h"
#include "deviascope/summary/line_density.h"
#include "figures/sheet.h"

namespace deviascope {

struct Scalar {
    std::string name;            ///< `velocity.x`, `velocity.amplitude`, `weight.dunlin.faint`
    std::string words;           ///< for axis titles: `speed`, `dunlin x`
    Line symbol;                 ///< for the joint figure
    std::string unit;            ///< `km/s`, `10⁻³`, empty
    double scale = 1.0;          ///< what values of the chain were multiplied by
    std::vector<double> values;  ///< scaled; in the order of rows_of
    Support support;             ///< scaled
    ScalarEstimate estimate;     ///< scaled; intervals of one-sided ones begin at 0
    LineDensity density;         ///< scaled
    double effective = 0.0;      ///< independent draws
    std::size_t series = 0;      ///< colour
    bool is_one_sided = false;   ///< has upper limits: not told from 0

    /// `1 656 +103 −90`, or `< 4.6 (95 %)`, without unit.
    Line value_text() const;
    /// The same in plain words with its unit.
    std::string value_words() const;
};

/// The amplitude of a vector: the velocity's in km/s, an intrinsic dipole's in 10^-3.
Scalar amplitude_scalar(const FigureContext& context, const VectorSeries& series);

/// A scalar by name: a parameter of the chain, or `<vector>.amplitude`.
/// Errors: UsageError where there is none of that name, or it does not vary.
Scalar scalar_named(const FigureContext& context, const std::string& name);

/// The numbers that figures mark on a scalar's axis.
struct Mark {
    const char* name;
    double value;
};
std::vector<Mark> marks_of(const Scalar& scalar);

/// Area under a curve between two values, as a closed shape on scales.
Polyline area_under(const LineDensity& density,
                    const Interval& ends,
                    const Scale& across,
                    const Scale& up);

}  // namespace deviascope
