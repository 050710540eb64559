// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/summary/line_density.h"

#include <algorithm>
#include <cmath>
#include <numbers>

#include "deviascope/summary/interval.h"
#include "summary/boundary_kernel.h"

namespace deviascope {
namespace {

constexpr double reach_in_bandwidths = 5.0;  // beyond, the kernel is below 4e-6 of its peak

double normal_density(double u) {
    return std::exp(-0.5 * u * u) / std::sqrt(2.0 * std::numbers::pi);
}
double normal_mass_below(double u) {
    return 0.5 * std::erfc(-u / std::numbers::sqrt2);
}

/// Moments 0, 1, 2 of the kernel's u = (x - X)/h between two ends.
struct KernelMoments {
    double a0, a1, a2;
    KernelMoments(double lowest, double highest)
        : a0(normal_mass_below(highest) - normal_mass_below(lowest)),
          a1(normal_density(lowest) - normal_density(highest)),
          a2(a0 + term(lowest) - term(highest)) {}

  private:
    static double term(double u) { return std::isfinite(u) ? u * normal_density(u) : 0.0; }
};

}  // namespace

AxisKernel::AxisKernel(
    double first, double step, Eigen::Index size, double bandwidth, Support support)
    : first_(first),
      step_(step),
      size_(size),
      reach_(std::min<Eigen::Index>(
          size - 1, static_cast<Eigen::Index>(reach_in_bandwidths * bandwidth / step) + 1)),
      kernel_(2 * reach_ + 1),
      first_moment_(2 * reach_ + 1),
      a0_(size),
      a1_(size),
      a2_(size) {
    for (Eigen::Index offset = -reach_; offset <= reach_; ++offset) {
        const double u = static_cast<double>(offset) * step / bandwidth;
        kernel_[offset + reach_] = normal_density(u) / bandwidth;
        first_moment_[offset + reach_] = u * normal_density(u) / bandwidth;
    }
    constexpr double infinity = std::numeric_limits<double>::infinity();
    for (Eigen::Index at = 0; at < size; ++at) {
        const double x = node(at);
        const KernelMoments moments(
            support.highest ? (x - *support.highest) / bandwidth : -infinity,
            support.lowest ? (x - *support.lowest) / bandwidth : infinity);
        a0_[at] = moments.a0;
        a1_[at] = moments.a1;
        a2_[at] = moments.a2;
    }
}

AxisKernel::Share AxisKernel::share_of(double value) const {
    const double place = std::clamp((value - first_) / step_, 0.0, double(size_ - 1));
    const auto lower = std::min(static_cast<Eigen::Index>(place), size_ - 2);
    return {lower, place - static_cast<double>(lower)};
}

Eigen::ArrayXd AxisKernel::sum(const Eigen::ArrayXd& binned,
                               const Eigen::ArrayXd& kernel) const {
    Eigen::ArrayXd total = Eigen::ArrayXd::Zero(size_);
    for (Eigen::Index from = 0; from < size_; ++from) {
        if (binned[from] == 0.0) continue;
        const Eigen::Index begin = std::max<Eigen::Index>(0, from - reach_);
        const Eigen::Index end = std::min(size_ - 1, from + reach_);
        total.segment(begin, end - begin + 1) +=
            binned[from] * kernel.segment(begin - from + reach_, end - begin + 1);
    }
    return total;
}

Eigen::ArrayXd AxisKernel::plain(const Eigen::ArrayXd& binned) const {
    return sum(binned, kernel_);
}

Eigen::ArrayXd AxisKernel::linear(const Eigen::ArrayXd& binned) const {
    return (a2_ * sum(binned, kernel_) - a1_ * sum(binned, first_moment_)) /
           (a0_ * a2_ - a1_ * a1_);
}

double non_negative(double f0, double f_linear) {
    return f0 > 0.0 ? f0 * std::exp(f_linear / f0 - 1.0) : 0.0;
}

double robust_spread(std::vector<double> values) {
    std::sort(values.begin(), values.end());
    const ScalarEstimate estimate = estimate_of(values);
    const double iqr = (quantile_of(values, 0.75) - quantile_of(values, 0.25)) / 1.349;
    return iqr > 0.0 ? std::min(iqr, estimate.sd) : estimate.sd;
}

double LineDensity::at(double value) const {
    if (place.size() < 2 || !(value >= place.front() && value <= place.back())) return 0.0;
    const double step = (place.back() - place.front()) / static_cast<double>(place.size() - 1);
    const auto lower =
        std::min(static_cast<std::size_t>((value - place.front()) / step), place.size() - 2);
    const double share = (value - place[lower]) / step;
    return density[lower] + share * (density[lower + 1] - density[lower]);
}

double LineDensity::peak() const {
    return density.empty() ? 0.0 : *std::max_element(density.begin(), density.end());
}

LineDensity line_density(std::span<const double> values,
                         double effective_draws,
                         const Support& support) {
    constexpr Eigen::Index n_nodes = 512;
    LineDensity result;
    if (values.size() < 2) return result;
    const auto [least, most] = std::minmax_element(values.begin(), values.end());
    if (*least == *most) return result;
    const double effective =
        std::clamp(effective_draws, 2.0, static_cast<double>(values.size()));
    const double bandwidth =
        1.06 * robust_spread({values.begin(), values.end()}) * std::pow(effective, -0.2);
    const double first =
        std::max(*least - 4.0 * bandwidth, support.lowest.value_or(*least - 4.0 * bandwidth));
    const double last =
        std::min(*most + 4.0 * bandwidth, support.highest.value_or(*most + 4.0 * bandwidth));
    const double step = (last - first) / static_cast<double>(n_nodes - 1);
    const AxisKernel kernel(first, step, n_nodes, bandwidth, support);
    Eigen::ArrayXd binned = Eigen::ArrayXd::Zero(n_nodes);
    for (const double value : values) {
        const auto [lower, upper_share] = kernel.share_of(value);
        binned[lower] += 1.0 - upper_share;
        binned[lower + 1] += upper_share;
    }
    const Eigen::ArrayXd plain = kernel.plain(binned) / kernel.mass();
    const Eigen::ArrayXd linear = kernel.linear(binned);
    double mass = 0.0;
    for (Eigen::Index at = 0; at < n_nodes; ++at) {
        result.place.push_back(kernel.node(at));
        result.density.push_back(non_negative(plain[at], linear[at]));
        const bool is_end = at == 0 || at == n_nodes - 1;
        mass += step * (is_end ? 0.5 : 1.0) * result.density.back();
    }
    for (double& density : result.density) density /= mass;
    return result;
}

}  // namespace deviascope
