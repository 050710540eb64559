// SPDX-License-Identifier: GPL-2.0-or-later
#include "weights/weights_from_tally.h"

#include <cmath>
#include <limits>

namespace deviascope {

namespace {

constexpr double no_number = std::numeric_limits<double>::quiet_NaN();

EdgePlan planned(const Boxes& boxes, const CrossingTally& sums, std::size_t e) {
    const Edge& edge = boxes.edge[e];
    const std::vector<double> count = sums.counts(e, 0);
    return plan_edge({sums.cells(e),
                      count,
                      sums.extent_below(e),
                      sums.extent_above(e),
                      edge.inside_is_above(),
                      !edge.upper && is_end_of_property(edge.kind, edge.value)});
}

const EdgeWindow& window_of(const EdgePlan& plan, WindowWidth width) {
    if (width == WindowWidth::half) return plan.half;
    return width == WindowWidth::twice ? plan.twice : plan.window;
}

}  // namespace

WeightEstimator::WeightEstimator(const Boxes& boxes,
                                 const CrossingTally& sums,
                                 double one_plus_alpha)
    : boxes_(boxes), sums_(sums), one_plus_alpha_(one_plus_alpha) {
    for (std::size_t e = 0; e < boxes.edge.size(); ++e)
        plans_.push_back(planned(boxes, sums, e));
    fit_catalogue();
}

WeightEstimator::WeightEstimator(const Boxes& boxes,
                                 const CrossingTally& sums,
                                 double one_plus_alpha,
                                 const WeightEstimator& windows)
    : boxes_(boxes), sums_(sums), one_plus_alpha_(one_plus_alpha), plans_(windows.plans_) {
    fit_catalogue();
}

void WeightEstimator::fit_catalogue() {
    for (std::size_t e = 0; e < plans_.size(); ++e) {
        densities_.emplace_back();
        const EdgeWindow& window = plans_[e].window;
        if (plans_[e].too_few || window.n_cells() == 0) continue;
        const std::vector<double> count = sums_.counts(e, 0);
        densities_.back() = DensityFit(boundaries_of(sums_.cells(e), window), density_degree)
                                .fit(within(count, window));
    }
}

double WeightEstimator::mean_index(std::size_t edge,
                                   std::size_t replicate,
                                   const EdgeWindow& window) const {
    if (!feels_spectral_index(boxes_.edge[edge].kind)) return 1.0;
    const bool is_given = !std::isnan(one_plus_alpha_);
    if (is_given && (replicate == 0 || !sums_.index_varies())) return one_plus_alpha_;
    const std::vector<double> count = sums_.counts(edge, replicate);
    const std::vector<double> sum = sums_.index_sums(edge, replicate);
    return mean_at_edge(boundaries_of(sums_.cells(edge), window),
                        within(count, window),
                        within(sum, window),
                        density_degree);
}

double WeightEstimator::rate(std::size_t edge, std::size_t replicate, WindowWidth width) const {
    const EdgePlan& plan = plans_[edge];
    if (plan.method == EdgeMethod::end_of_property) return 0.0;
    const EdgeWindow& window = window_of(plan, width);
    if (plan.too_few || window.n_cells() <= density_degree) return no_number;
    const DensityFit fit(boundaries_of(sums_.cells(edge), window), density_degree);
    const bool near_catalogue = width == WindowWidth::chosen && densities_[edge].has_value();
    const std::vector<double> count = sums_.counts(edge, replicate);
    const auto density =
        fit.fit(within(count, window), near_catalogue ? &*densities_[edge] : nullptr);
    if (!density) return no_number;
    return speed_of(boxes_.edge[edge].kind) * density->at_edge() *
           mean_index(edge, replicate, window);
}

double WeightEstimator::term(std::size_t edge, std::size_t replicate, WindowWidth width) const {
    const Edge& of = boxes_.edge[edge];
    const double sign = of.upper ? -1.0 : 1.0;
    return sign * rate(edge, replicate, width) / sums_.in_box(of.box, replicate);
}

std::vector<double> WeightEstimator::weights(std::size_t replicate, WindowWidth width) const {
    std::vector<double> weight(boxes_.box.size(), 2.0);
    std::vector<double> rates(boxes_.edge.size());
    for (std::size_t e = 0; e < boxes_.edge.size(); ++e) {
        const Edge& edge = boxes_.edge[e];
        const std::size_t first = sums_.sums_of(e);
        // Edges that share their sums differ in which side is inside, hence in their windows.
        const bool is_known = first != e && plans_[first] == plans_[e];
        rates[e] = is_known ? rates[first] : rate(e, replicate, width);
        weight[edge.box] +=
            (edge.upper ? -1.0 : 1.0) * rates[e] / sums_.in_box(edge.box, replicate);
    }
    return weight;
}

}  // namespace deviascope
