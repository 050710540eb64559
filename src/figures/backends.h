// SPDX-License-Identifier: GPL-2.0-or-later
// FIGURES, inside: the back-ends of a drawing
#pragma once

#include <string>

#include "figures/drawing.h"
#include "figures/fonts.h"

namespace deviascope {

/// What an SVG says about itself, and how it is to be used.
struct SvgWords {
    std::string title;        ///< for screen readers
    std::string description;  ///< alternative text, with the numbers
    /// Put before every id, so that several SVGs may stand in one page.
    std::string prefix;
    /// Inlined in a page: colours are custom properties (`var(--c5761AD,#5761AD)`), which a
    /// style sheet may set for a dark page; no XML declaration.
    bool inlined = false;
};

/// SVG 1.1 with real text. Numbers have at most two decimals; the same drawing gives the same
/// bytes.
std::string to_svg(const Drawing& drawing, const Fonts& fonts, const SvgWords& words);

/// PDF with embedded subsets of the fonts, its date fixed. Errors: OutputError.
std::string to_pdf(const Drawing& drawing, const Fonts& fonts, const std::string& title);

/// PNG on white paper. Errors: OutputError.
std::string to_png(const Drawing& drawing, const Fonts& fonts, double dots_per_inch);

/// A raster as a PNG file.
std::string to_png(const Raster& raster);

/// The colours of the palette as custom properties for inlined SVGs: on a dark page, and as
/// they are.
std::string dark_properties();
std::string light_properties();

/// Text as it may stand in XML and HTML, attributes too; control characters become blanks.
std::string escaped(const std::string& text);
/// The same, but line ends and tabs stay.
std::string escaped_lines(const std::string& text);

}  // namespace deviascope
