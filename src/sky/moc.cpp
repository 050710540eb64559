// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/sky/moc.h"

#include <algorithm>
#include <bit>
#include <cmath>

#include "deviascope/core/error.h"
#include "sky/deepest_pixel.h"

namespace deviascope {

namespace {

constexpr std::int64_t n_deepest = std::int64_t{12} << 2 * Moc::deepest_order;

bool is_range(const Moc::Range& range) {
    return range.begin >= 0 && range.begin < range.end && range.end <= n_deepest;
}

}  // namespace

Moc::Moc(std::vector<Range> ranges) {
    ensure(std::ranges::all_of(ranges, is_range), "ranges of a MOC lie inside the sky");
    std::ranges::sort(ranges, {}, &Range::begin);
    for (const Range& range : ranges) {
        if (!ranges_.empty() && range.begin <= ranges_.back().end) {
            ranges_.back().end = std::max(ranges_.back().end, range.end);
        } else {
            ranges_.push_back(range);
        }
    }
}

int Moc::order() const {
    std::uint64_t ends = 0;
    for (const Range& range : ranges_)
        ends |= static_cast<std::uint64_t>(range.begin) | static_cast<std::uint64_t>(range.end);
    if (ends == 0) return 0;
    return std::max(0, deepest_order - std::countr_zero(ends) / 2);
}

double Moc::sky_fraction() const {
    std::int64_t inside = 0;
    for (const Range& range : ranges_) inside += range.end - range.begin;
    return static_cast<double>(inside) / static_cast<double>(n_deepest);
}

bool Moc::contains(const Direction& direction) const {
    const std::int64_t pixel = deepest_pixel_at(direction);
    const auto after = std::ranges::upper_bound(ranges_, pixel, {}, &Range::begin);
    return after != ranges_.begin() && pixel < std::prev(after)->end;
}

double Moc::share_of(std::int64_t nested, int order) const {
    ensure(order >= 0 && order <= deepest_order, "an order of a MOC is 0 to 29");
    ensure(nested >= 0 && nested < (std::int64_t{12} << 2 * order),
           "a pixel number lies inside the grid");
    const int shift = 2 * (deepest_order - order);
    const Range pixel{nested << shift, (nested + 1) << shift};
    auto range = std::ranges::upper_bound(ranges_, pixel.begin, {}, &Range::end);
    std::int64_t inside = 0;
    for (; range != ranges_.end() && range->begin < pixel.end; ++range)
        inside += std::min(range->end, pixel.end) - std::max(range->begin, pixel.begin);
    return std::ldexp(static_cast<double>(inside), -shift);
}

}  // namespace deviascope
