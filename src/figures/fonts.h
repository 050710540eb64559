// SPDX-License-Identifier: GPL-2.0-or-later
// FIGURES, inside: faces by file path; no look-up by name, so that figures do not depend on
// what else is installed
#pragma once

#include <filesystem>
#include <memory>
#include <vector>

#include "figures/drawing.h"

namespace deviascope {

/// One glyph of a line: which file it comes from and where it stands, in sizes from the start
/// of the line.
struct PlacedGlyph {
    std::size_t file = 0;
    unsigned long index = 0;
    double x = 0.0, rise = 0.0, scale = 1.0;
    std::size_t bytes = 0;  ///< of UTF-8 text that it stands for
};

/// The faces that figures are set in: Open Sans, with DejaVu Sans for letters it lacks.
/// No shaping: fits Latin, Greek and mathematics. Threads: one at a time.
class Fonts {
  public:
    /// @param own  a font file to use in place of Open Sans; empty: none
    /// Errors: UsageError where `own` is no font, OutputError where no face is found at all.
    explicit Fonts(const std::filesystem::path& own = {});
    ~Fonts();

    /// Width in points at a size.
    double width(const Line& line, double size) const;
    double width(const std::string& text, double size, Face face = Face::regular) const;
    std::vector<PlacedGlyph> glyphs(const Line& line) const;
    /// FT_Face of a file.
    void* face(std::size_t file) const;
    std::size_t n_files() const;
    static std::string library_version();
    /// Name of the family for SVG.
    std::string family() const;

  private:
    struct Parts;
    std::unique_ptr<Parts> parts_;
};

/// A text without control characters (each becomes a blank) and without broken UTF-8 (U+FFFD).
std::string printable(const std::string& text);

/// Cut in the middle with an ellipsis so that it fits.
std::string shortened(const Fonts& fonts, const std::string& text, double size, double width);

/// Folded at blanks into lines that fit; single words longer than that are cut.
std::vector<std::string> wrapped(const Fonts& fonts,
                                 const std::string& text,
                                 double size,
                                 double width);

}  // namespace deviascope
