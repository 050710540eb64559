// SPDX-License-Identifier: GPL-2.0-or-later
#include "figures/colour.h"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <utility>

#include "deviascope/core/physical_constants.h"

namespace deviascope {
namespace {

/// Linear light to the sRGB byte.
std::uint8_t channel(double linear) {
    const double x = std::clamp(linear, 0.0, 1.0);
    const double encoded = x <= 0.0031308 ? 12.92 * x : 1.055 * std::pow(x, 1.0 / 2.4) - 0.055;
    return static_cast<std::uint8_t>(std::lround(255.0 * encoded));
}

double cube(double x) {
    return x * x * x;
}

/// A series in OKLCH.
struct Tone {
    double lightness, chroma, hue_deg;
};
// Indigo, brass, oxblood and midnight.
constexpr std::array<Tone, 4> tones{
    {{0.52, 0.12, 276}, {0.66, 0.11, 96}, {0.42, 0.10, 28}, {0.26, 0.13, 280}}};

const Tone& tone_of(std::size_t index) {
    return tones[index % tones.size()];
}

Colour half_diverging(double t, double depth, double chroma) {
    const double size = std::min(std::abs(t), 1.0);
    return oklch(0.965 - depth * size, chroma * std::pow(size, 0.9), t < 0.0 ? 255.0 : 60.0);
}

}  // namespace

std::string Colour::hex() const {
    return fmt::format("#{:02X}{:02X}{:02X}", red, green, blue);
}

Colour oklch(double lightness, double chroma, double hue_deg) {
    const double hue = hue_deg * radians_per_degree;
    const double a = chroma * std::cos(hue), b = chroma * std::sin(hue);
    const double l = cube(lightness + 0.3963377774 * a + 0.2158037573 * b);
    const double m = cube(lightness - 0.1055613458 * a - 0.0638541728 * b);
    const double s = cube(lightness - 0.0894841775 * a - 1.2914855480 * b);
    return {channel(4.0767416621 * l - 3.3077115913 * m + 0.2309699292 * s),
            channel(-1.2684380046 * l + 2.6097574011 * m - 0.3413193965 * s),
            channel(-0.0041960863 * l - 0.7034186147 * m + 1.7076147010 * s)};
}

namespace palette {

Colour ink() {
    return oklch(0.245, 0.022, 276);
}
Colour grey_text() {
    return oklch(0.52, 0.014, 276);
}
Colour paper() {
    return {255, 255, 255};
}
Colour panel() {
    return oklch(0.972, 0.004, 276);
}
Colour tile() {
    return oklch(0.945, 0.009, 276);
}
Colour plain_sky() {
    return oklch(0.986, 0.003, 276);
}
Colour mask() {
    return oklch(0.83, 0.008, 276);
}
Colour prior() {
    return oklch(0.60, 0.010, 276);
}
Colour warning() {
    return oklch(0.50, 0.15, 34);
}

Colour series(std::size_t index) {
    const Tone& tone = tone_of(index);
    return oklch(tone.lightness, tone.chroma, tone.hue_deg);
}
Colour fill68(std::size_t index) {
    const Tone& tone = tone_of(index);
    return oklch(0.74, 0.625 * tone.chroma, tone.hue_deg);
}
Colour fill95(std::size_t index) {
    const Tone& tone = tone_of(index);
    return oklch(0.90, 0.27 * tone.chroma, tone.hue_deg);
}

Colour on_dark(const Colour& colour) {
    static const auto pairs = [] {
        std::vector<std::pair<Colour, Colour>> made{{ink(), oklch(0.93, 0.010, 276)},
                                                    {grey_text(), oklch(0.74, 0.012, 276)},
                                                    {paper(), oklch(0.21, 0.014, 276)},
                                                    {panel(), oklch(0.25, 0.014, 276)},
                                                    {tile(), oklch(0.28, 0.018, 276)},
                                                    {plain_sky(), oklch(0.25, 0.012, 276)},
                                                    {mask(), oklch(0.36, 0.012, 276)},
                                                    {prior(), oklch(0.68, 0.010, 276)},
                                                    {warning(), oklch(0.76, 0.13, 40)}};
        for (std::size_t index = 0; index < tones.size(); ++index) {
            const Tone& tone = tones[index];
            const double lift = 0.90 - 0.35 * tone.lightness;  // the darkest gets lightest
            made.emplace_back(series(index), oklch(lift, 0.9 * tone.chroma, tone.hue_deg));
            made.emplace_back(fill68(index), oklch(0.50, 0.6 * tone.chroma, tone.hue_deg));
            made.emplace_back(fill95(index), oklch(0.36, 0.4 * tone.chroma, tone.hue_deg));
        }
        return made;
    }();
    const auto found = std::find_if(pairs.begin(), pairs.end(), [&](const auto& pair) {
        return pair.first == colour.with_alpha(1.0);
    });
    return found == pairs.end() ? colour : found->second.with_alpha(colour.alpha);
}

}  // namespace palette

Colour diverging(double t) {
    return half_diverging(t, 0.33, 0.085);
}

Colour strongly_diverging(double t) {
    return half_diverging(t, 0.50, 0.12);
}

}  // namespace deviascope
