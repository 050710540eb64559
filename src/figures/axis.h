// SPDX-License-Identifier: GPL-2.0-or-later
// FIGURES, inside: scales, ticks whose labels do not collide, open axes
#pragma once

#include <string>
#include <vector>

#include "figures/drawing.h"
#include "figures/fonts.h"

namespace deviascope {

/// Sizes of text and lines, in points.
namespace type {
inline constexpr double title = 9.5, axis_title = 7.5, tick = 6.5, note = 7.0, symbol = 13.0;
}
namespace rule {
inline constexpr double frame = 0.7, tick = 0.5, tick_length = 2.5, curve = 1.1;
inline constexpr double outline68 = 1.2, outline95 = 0.7, graticule = 0.35, reference = 0.9;
}  // namespace rule

/// A linear scale: values lo … hi stand at places from … to.
struct Scale {
    double lo = 0.0, hi = 1.0;
    double from = 0.0, to = 1.0;
    double at(double value) const { return from + (value - lo) / (hi - lo) * (to - from); }
};

struct Tick {
    double value = 0.0;
    std::string label;
};

/// Round values (1, 2, 2.5 or 5 times a power of ten) inside a scale, as many as their labels
/// leave room for: labels side by side keep 5 pt, one above the other half their height. A
/// scale with room for one label only has one tick; the labels never say "-0".
std::vector<Tick> ticks_of(const Scale& scale, const Fonts& fonts, bool side_by_side);

/// A number with fixed decimals, a true minus sign and never "-0".
std::string plain_number(double value, int decimals);

/// The same; a dash where it is not finite.
std::string number_or_dash(double value, int decimals);

/// A number rounded by its uncertainty as the summary rounds it (thin blanks, true minus).
std::string measured_number(double value, double uncertainty);

/// Ticks outside along the bottom (or left) of a panel, with labels and line.
struct AxisLook {
    bool labels = true;
    bool line = true;
    double step = 0.0;    ///< of ticks, a whole number; 0: as they fit
    bool inside = false;  ///< labels do not stand out beyond the ends (another axis is there)
};
void draw_bottom_axis(Drawing& drawing,
                      const Fonts& fonts,
                      const Scale& scale,
                      double y,
                      const AxisLook& look = {});
/// Returns the width that the labels take.
double draw_left_axis(Drawing& drawing,
                      const Fonts& fonts,
                      const Scale& scale,
                      double x,
                      const AxisLook& look = {});

/// A line of text in one face.
Text text_at(Point at,
             const std::string& text,
             double size,
             Anchor anchor = Anchor::start,
             Colour colour = palette::ink());

/// The box that a line of text takes, without turn.
Box box_of(const Text& text, const Fonts& fonts);

/// Notes under a figure, folded; returns the place below them.
double draw_notes(Drawing& drawing,
                  const Fonts& fonts,
                  const std::vector<std::string>& notes,
                  double left,
                  double top,
                  Colour colour);

}  // namespace deviascope
