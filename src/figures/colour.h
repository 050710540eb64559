// SPDX-License-Identifier: GPL-2.0-or-later
// FIGURES, inside: the palette, by rule
#pragma once

#include <cstdint>
#include <string>

namespace deviascope {

/// An sRGB colour of 8 bits a channel, and its opacity 0 … 1.
struct Colour {
    std::uint8_t red = 0, green = 0, blue = 0;
    double alpha = 1.0;

    Colour with_alpha(double opacity) const { return {red, green, blue, opacity}; }
    /// `#5761AD`, without the opacity.
    std::string hex() const;
    bool operator==(const Colour&) const = default;
};

/// The colour of an OKLab lightness, chroma and hue (degrees), clipped to sRGB.
/// Source: Ottosson 2020, "A perceptual color space for image processing" (matrices from
/// memory; the tests hold them against published triples); transfer curve: IEC 61966-2-1.
Colour oklch(double lightness, double chroma, double hue_deg);

/// The palette: a compass stand in round OKLCH numbers. Series keep four lightness steps in
/// grey print and stay apart under simulated colour-vision deficiency.
namespace palette {
Colour ink();
Colour grey_text();
Colour paper();
Colour panel();      ///< behind traces
Colour tile();       ///< behind the diagonal of the joint figure
Colour plain_sky();  ///< under directions
Colour mask();       ///< not observed
Colour prior();      ///< curves and bars of priors
Colour warning();    ///< a caution inside a figure
/// Lines and marks of series 0 (velocity), 1, 2, …; from 4 on the colours come again (with
/// another dash).
Colour series(std::size_t index);
/// Opaque fills of a series: what holds 68 %, and 95 %.
Colour fill68(std::size_t index);
Colour fill95(std::size_t index);
/// The same colour on a dark page; itself where it has no other.
Colour on_dark(const Colour& colour);
}  // namespace palette

/// Diverging scale, t = -1 … 1 (clipped): L = .965 - .33|t|, C = .085 |t|^.9, hue 255 deg below
/// zero and 60 deg above.
Colour diverging(double t);
/// The stronger one, for small marks: L = .97 - .50|t|, C = .12 |t|^.9.
Colour strongly_diverging(double t);

}  // namespace deviascope
