// SPDX-License-Identifier: GPL-2.0-or-later
#include "weights/edge_window.h"

#include <algorithm>
#include <cmath>

namespace deviascope {

namespace {

constexpr int narrowest = 10;         // scales go from the neighbourhood to 1/32 of it
constexpr double least_sources = 50;  // in a window
constexpr int least_cells = 8;
constexpr double visible_bias = 2.0;  // standard deviations

/// Largest windows that the catalogue fills.
EdgeWindow filled(const EdgeNeighbourhood& edge) {
    return {edge.cells.whole_cells_within(edge.extent_below),
            edge.cells.whole_cells_within(edge.extent_above)};
}

/// The window of a scale: 2^(-scale/2) of the neighbourhood, as far as it is filled.
EdgeWindow of_scale(const EdgeNeighbourhood& edge, const EdgeWindow& limit, int scale) {
    const double width = edge.cells.reach() * std::exp2(-0.5 * scale);
    const int cells = edge.cells.whole_cells_within(width * (1.0 + 1e-12));
    return {std::min(cells, limit.below), std::min(cells, limit.above)};
}

double sum(std::span<const double> values) {
    double total = 0.0;
    for (const double value : values) total += value;
    return total;
}

double sources_in(const EdgeNeighbourhood& edge, const EdgeWindow& window) {
    return sum(within(edge.count, window));
}

/// Whether degree 2 misses nothing that degree 4 sees.
bool shows_no_bias(const EdgeNeighbourhood& edge, const EdgeWindow& window) {
    if (window.n_cells() < least_cells) return false;
    const std::vector<double> boundary = boundaries_of(edge.cells, window);
    const auto count = within(edge.count, window);
    const auto plain = DensityFit(boundary, density_degree).fit(count);
    const auto finer = DensityFit(boundary, test_degree).fit(count);
    if (!plain || !finer) return false;
    const double missed = plain->coefficient[0] - finer->coefficient[0];
    const double variance = std::max(finer->variance - plain->variance, 0.0);
    return std::abs(missed) <= visible_bias * std::sqrt(variance);
}

/// The widest scale without visible bias; beyond the narrowest where there is none.
int widest_without_bias(const EdgeNeighbourhood& edge, const EdgeWindow& limit) {
    bool wider_passed = false;
    for (int scale = 0; scale <= narrowest; ++scale) {
        const bool passes = shows_no_bias(edge, of_scale(edge, limit, scale));
        if (passes && wider_passed) return scale - 1;
        wider_passed = passes;
    }
    return narrowest + 1;
}

/// Widens a scale until its window holds enough sources.
int wide_enough(const EdgeNeighbourhood& edge, const EdgeWindow& limit, int scale) {
    while (scale > 0) {
        const EdgeWindow window = of_scale(edge, limit, scale);
        if (window.n_cells() >= least_cells && sources_in(edge, window) >= least_sources) break;
        --scale;
    }
    return scale;
}

/// Whether the outside holds far fewer sources than the inside, extrapolated as an exponential,
/// lets expect: in the widest window of an eighth of the neighbourhood or less, and of a third
/// of the outside's extent, that holds up to 4000 sources inside.
bool falls_off_outside(const EdgeNeighbourhood& edge, const EdgeWindow& limit) {
    constexpr double many = 4000.0, deviations = 5.0, share = 0.7;
    const double outside_extent = edge.inside_is_above ? edge.extent_below : edge.extent_above;
    for (int scale = 6; scale <= narrowest; ++scale) {
        const double width = edge.cells.reach() * std::exp2(-0.5 * scale);
        if (width > outside_extent / 3.0) continue;
        const EdgeWindow both = of_scale(edge, limit, scale);
        const EdgeWindow inside =
            edge.inside_is_above ? EdgeWindow{0, both.above} : EdgeWindow{both.below, 0};
        const EdgeWindow outside{both.below - inside.below, both.above - inside.above};
        const double n_inside = sources_in(edge, inside);
        if (n_inside > many && scale < narrowest) continue;
        if (inside.n_cells() < 3 || outside.n_cells() < 3 || n_inside < least_sources)
            return false;
        const auto density =
            DensityFit(boundaries_of(edge.cells, inside), 1).fit(within(edge.count, inside));
        if (!density) return false;
        double expected = 0.0;
        const std::vector<double> boundary = boundaries_of(edge.cells, outside);
        for (std::size_t i = 0; i + 1 < boundary.size(); ++i)
            expected += (boundary[i + 1] - boundary[i]) *
                        density->at(0.5 * (boundary[i] + boundary[i + 1]));
        const double found = sources_in(edge, outside);
        // The mean of a line outside, fitted inside an interval as long: variance 13 / n.
        const double sd = std::sqrt(expected + expected * expected * 13.0 / n_inside);
        return found < share * expected && expected - found > deviations * sd;
    }
    return false;
}

EdgeMethod method_of(const EdgeNeighbourhood& edge, const EdgeWindow& window) {
    const int inside = edge.inside_is_above ? window.above : window.below;
    const int outside = edge.inside_is_above ? window.below : window.above;
    return 2 * outside >= inside ? EdgeMethod::central : EdgeMethod::one_sided;
}

}  // namespace

std::string name_of(EdgeMethod method) {
    if (method == EdgeMethod::central) return "central";
    return method == EdgeMethod::one_sided ? "one-sided" : "end of the property";
}

std::span<const double> within(std::span<const double> cells, const EdgeWindow& window) {
    return cells.subspan(static_cast<std::size_t>(EdgeCells::a_side - window.below),
                         static_cast<std::size_t>(window.n_cells()));
}

std::vector<double> boundaries_of(const EdgeCells& cells, const EdgeWindow& window) {
    return cells.boundaries(-window.below, window.above);
}

EdgePlan plan_edge(const EdgeNeighbourhood& edge) {
    EdgePlan plan;
    EdgeWindow limit = filled(edge);
    int& outside = edge.inside_is_above ? limit.below : limit.above;
    if (edge.is_end_of_property && outside == 0) {
        plan.method = EdgeMethod::end_of_property;
        return plan;
    }
    plan.falls_off = falls_off_outside(edge, limit);
    if (plan.falls_off) outside = 0;
    plan.too_few = limit.n_cells() < least_cells || sources_in(edge, limit) < least_sources;
    if (plan.too_few) return plan;
    const int widest = widest_without_bias(edge, limit);
    plan.unsettled = widest > narrowest;
    const int scale = wide_enough(edge, limit, std::min(widest + 2, narrowest));
    plan.window = of_scale(edge, limit, scale);
    plan.half = of_scale(edge, limit, std::min(scale + 2, narrowest + 2));
    plan.twice = of_scale(edge, limit, std::max(scale - 2, 0));
    plan.sources = sources_in(edge, plan.window);
    plan.method = method_of(edge, plan.window);
    return plan;
}

}  // namespace deviascope
