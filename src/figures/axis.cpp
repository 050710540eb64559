// SPDX-License-Identifier: GPL-2.0-or-later
#include "figures/axis.h"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cmath>

#include "deviascope/core/error.h"
#include "summary/rounding.h"

namespace deviascope {
namespace {

constexpr double gap_beside = 5.0, gap_above = 0.5 * type::tick;

std::string with_true_minus(std::string digits) {
    if (digits.starts_with('-')) digits.replace(0, 1, "−");
    return digits;
}

/// Decimals that a step of 1, 2, 2.5 or 5 times 10^power needs.
int decimals_of(double factor, int power) {
    const int extra = factor == 2.5 ? 1 : 0;
    return std::clamp(extra - power, 0, 15);
}

std::vector<Tick> ticks_with_step(const Scale& scale, double factor, int power) {
    const double step = factor * std::pow(10.0, power);
    const double lo = std::min(scale.lo, scale.hi), hi = std::max(scale.lo, scale.hi);
    const double slack = 1e-9 * (hi - lo);
    std::vector<Tick> ticks;
    for (double n = std::ceil((lo - slack) / step); n * step <= hi + slack; ++n)
        ticks.push_back({n * step, plain_number(n * step, decimals_of(factor, power))});
    return ticks;
}

bool labels_fit(const std::vector<Tick>& ticks,
                const Scale& scale,
                const Fonts& fonts,
                bool side_by_side) {
    for (std::size_t tick = 1; tick < ticks.size(); ++tick) {
        const double room =
            std::abs(scale.at(ticks[tick].value) - scale.at(ticks[tick - 1].value));
        const double needed = side_by_side
                                  ? 0.5 * (fonts.width(ticks[tick].label, type::tick) +
                                           fonts.width(ticks[tick - 1].label, type::tick)) +
                                        gap_beside
                                  : type::tick + gap_above;
        if (room < needed) return false;
    }
    return true;
}

}  // namespace

std::string plain_number(double value, int decimals) {
    std::string digits = fmt::format("{:.{}f}", value, decimals);
    if (digits.find_first_not_of("-0.") == std::string::npos && digits.starts_with('-'))
        digits.erase(0, 1);
    return with_true_minus(digits);
}

std::string number_or_dash(double value, int decimals) {
    return std::isfinite(value) ? plain_number(value, decimals) : "–";
}

std::string measured_number(double value, double uncertainty) {
    return with_true_minus(rounded(value, uncertainty));
}

std::vector<Tick> ticks_of(const Scale& scale, const Fonts& fonts, bool side_by_side) {
    static constexpr std::array<double, 4> factors = {1.0, 2.0, 2.5, 5.0};
    const double span = std::abs(scale.hi - scale.lo);
    ensure(span > 0.0 && std::isfinite(span), "a scale has a length");
    // Never closer than this: a page of ticks reads worse than a few.
    const double closest = side_by_side ? 16.0 : 12.0;
    const double most = std::max(1.0, std::abs(scale.to - scale.from) / closest);
    int power = static_cast<int>(std::floor(std::log10(span / most)));
    std::vector<Tick> best;
    for (std::size_t trial = 0; trial < 12; ++trial) {
        const double factor = factors[trial % factors.size()];
        const int at = power + static_cast<int>(trial / factors.size());
        if (factor * std::pow(10.0, at) < span / most) continue;
        std::vector<Tick> ticks = ticks_with_step(scale, factor, at);
        if (ticks.empty()) break;
        if (labels_fit(ticks, scale, fonts, side_by_side)) return ticks;
        best = {ticks.front()};
    }
    return best;
}

void draw_bottom_axis(
    Drawing& drawing, const Fonts& fonts, const Scale& scale, double y, const AxisLook& look) {
    if (look.line) drawing.line({scale.from, y}, {scale.to, y}, {rule::frame, palette::ink()});
    const std::vector<Tick> ticks =
        look.step > 0.0 ? ticks_with_step(scale, look.step, 0) : ticks_of(scale, fonts, true);
    for (const Tick& tick : ticks) {
        const double x = scale.at(tick.value);
        drawing.line({x, y}, {x, y + rule::tick_length}, {rule::tick, palette::ink()});
        const double half = 0.5 * fonts.width(tick.label, type::tick);
        const bool stands_out = x - half < scale.from - 1.5 || x + half > scale.to + 1.5;
        if (look.labels && !(look.inside && stands_out))
            drawing.add(text_at({x, y + rule::tick_length + type::tick + 0.5},
                                tick.label,
                                type::tick,
                                Anchor::middle));
    }
}

double draw_left_axis(
    Drawing& drawing, const Fonts& fonts, const Scale& scale, double x, const AxisLook& look) {
    if (look.line) drawing.line({x, scale.from}, {x, scale.to}, {rule::frame, palette::ink()});
    double widest = 0.0;
    for (const Tick& tick : ticks_of(scale, fonts, false)) {
        const double y = scale.at(tick.value);
        drawing.line({x, y}, {x - rule::tick_length, y}, {rule::tick, palette::ink()});
        const bool stands_out =
            y - 0.4 * type::tick < scale.to - 1.5 || y + 0.4 * type::tick > scale.from + 1.5;
        if (!look.labels || (look.inside && stands_out)) continue;
        drawing.add(text_at({x - rule::tick_length - 1.5, y + 0.36 * type::tick},
                            tick.label,
                            type::tick,
                            Anchor::end));
        widest = std::max(widest, fonts.width(tick.label, type::tick));
    }
    return widest + rule::tick_length + 1.5;
}

Text text_at(Point at, const std::string& text, double size, Anchor anchor, Colour colour) {
    return {at, {{text}}, size, anchor, colour};
}

Box box_of(const Text& text, const Fonts& fonts) {
    const double width = fonts.width(text.runs, text.size);
    const double left = text.anchor == Anchor::start    ? text.at.x
                        : text.anchor == Anchor::middle ? text.at.x - 0.5 * width
                                                        : text.at.x - width;
    return {left, text.at.y - 0.8 * text.size, left + width, text.at.y + 0.25 * text.size};
}

double draw_notes(Drawing& drawing,
                  const Fonts& fonts,
                  const std::vector<std::string>& notes,
                  double left,
                  double top,
                  Colour colour) {
    double y = top;
    for (const std::string& note : notes)
        for (const std::string& line :
             wrapped(fonts, note, type::note, drawing.width - left - 4.0)) {
            y += 1.3 * type::note;
            drawing.add(text_at({left, y}, line, type::note, Anchor::start, colour));
        }
    return y;
}

}  // namespace deviascope
