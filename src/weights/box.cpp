// SPDX-License-Identifier: GPL-2.0-or-later
#include "weights/box.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "deviascope/core/error.h"

namespace deviascope {

namespace {

std::size_t dimension_of(std::vector<Dimension>& known, const std::string& property) {
    const auto found = std::ranges::find(known, property, &Dimension::property);
    const auto index = static_cast<std::size_t>(found - known.begin());
    if (found == known.end()) known.push_back({property, displaced_by_boost(property)});
    return index;
}

void narrow(std::vector<BoxSide>& sides, std::size_t dimension, const PropertyRange& range) {
    const auto side = std::ranges::find(sides, dimension, &BoxSide::dimension);
    if (side == sides.end()) {
        sides.push_back({dimension, range.low, range.high});
    } else {
        side->low = std::max(side->low, range.low);
        side->high = std::min(side->high, range.high);
    }
}

void refuse_empty(const std::string& place, const std::string& property, const BoxSide& side) {
    if (side.low < side.high) return;
    throw InputError(
        {place,
         fmt::format(
             "its {} and the survey's leave nothing: [{}, {})", property, side.low, side.high),
         "ranges of the bin and of the survey that overlap",
         "correct one of the two"});
}

/// Whether a boost makes sources cross this end of a side.
bool is_crossed(Displaced kind, double value) {
    const bool cannot_cross_zero = kind == Displaced::flux || kind == Displaced::size;
    return kind != Displaced::not_at_all && std::isfinite(value) &&
           !(cannot_cross_zero && value == 0.0);
}

}  // namespace

Boxes::Boxes(const SurveyInput& survey, const std::vector<std::size_t>& bins) {
    for (const std::size_t bin : bins) {
        const BinInput& input = survey.bins[bin];
        const std::string place = fmt::format("survey {}, bin {}", survey.name, input.name);
        BinBox made{bin, {}};
        for (const auto* ranges : {&survey.select, &input.select})
            for (const PropertyRange& range : *ranges)
                narrow(made.sides, dimension_of(dimension, range.property), range);
        first_side.push_back(edges_of_side.size());
        for (std::size_t s = 0; s < made.sides.size(); ++s) {
            const BoxSide& side = made.sides[s];
            const Dimension& of = dimension[side.dimension];
            refuse_empty(place, of.property, side);
            edges_of_side.emplace_back();
            for (const bool upper : {false, true}) {
                const double value = upper ? side.high : side.low;
                if (!is_crossed(of.kind, value)) continue;
                const double centre = coordinate_of(of.kind, value);
                if (std::isnan(centre))
                    throw InputError(
                        {place,
                         fmt::format("an edge at {} {}", of.property, value),
                         "edges at positive fluxes and sizes and at redshifts above -1 have a "
                         "weight that can be measured",
                         "use -inf for a side that is open, or give the bin its weight"});
                edges_of_side.back().push_back(edge.size());
                edge.push_back({box.size(), s, upper, value, centre, of.kind});
            }
        }
        box.push_back(std::move(made));
    }
}

std::size_t Boxes::first_like(std::size_t e) const {
    const auto others = [&](const Edge& of) {
        std::vector<BoxSide> sides = box[of.box].sides;
        sides.erase(sides.begin() + static_cast<std::ptrdiff_t>(of.side));
        return sides;
    };
    const auto dimension_at = [&](const Edge& of) {
        return box[of.box].sides[of.side].dimension;
    };
    for (std::size_t i = 0; i < e; ++i)
        if (edge[i].value == edge[e].value && dimension_at(edge[i]) == dimension_at(edge[e]) &&
            others(edge[i]) == others(edge[e]))
            return i;
    return e;
}

bool Boxes::need_spectral_index() const {
    return std::ranges::any_of(edge,
                               [](const Edge& e) { return feels_spectral_index(e.kind); });
}

}  // namespace deviascope
