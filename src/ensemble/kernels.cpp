// SPDX-License-Identifier: GPL-2.0-or-later
#include "ensemble/kernels.h"

#include <fmt/format.h>

#include <cmath>

#include "deviascope/core/error.h"

namespace deviascope {

namespace {

constexpr double stretch_scale = 2.0;  // a
constexpr double jump_share = 0.1;     // moves with the base 1
constexpr double jitter = 0.01;

/// A number from 0 to n-1; the bias of about n 2^-53 is far below anything visible.
std::size_t draw_index(Stream& stream, std::size_t n) {
    return static_cast<std::size_t>(uniform(stream) * static_cast<double>(n));
}

Proposal stretch(const double* x, const Partners& others, Stream& stream, double* y) {
    const double* from = others.at(draw_index(stream, others.count));
    const double z = stretch_factor(uniform(stream));
    const std::size_t n = others.n_coordinates;
    for (std::size_t axis = 0; axis < n; ++axis)
        y[axis] = from[axis] + z * (x[axis] - from[axis]);
    return {Kernel::stretch, (static_cast<double>(n) - 1.0) * std::log(z)};
}

Proposal differential_evolution(const double* x,
                                const Partners& others,
                                Stream& stream,
                                double* y) {
    const std::size_t j = draw_index(stream, others.count);
    std::size_t k = draw_index(stream, others.count - 1);
    if (k >= j) ++k;
    const std::size_t n = others.n_coordinates;
    const bool is_jump = uniform(stream) < jump_share;
    const double base = is_jump ? 1.0 : 2.38 / std::sqrt(2.0 * static_cast<double>(n));
    const double g = base * (1.0 + jitter * normal(stream));
    const double* to = others.at(j);
    const double* from = others.at(k);
    for (std::size_t axis = 0; axis < n; ++axis)
        y[axis] = x[axis] + g * (to[axis] - from[axis]);
    return {Kernel::differential_evolution, 0.0};
}

}  // namespace

KernelMix::KernelMix(const KernelFractions& fractions, bool has_independence) {
    KernelFractions used = fractions;
    if (!has_independence && used.independence > 0.0) {
        const double others = used.stretch + used.differential_evolution;
        if (others <= 0.0)
            throw UsageError({"kernels.independence",
                              fmt::format("{}", used.independence),
                              "this target offers no approximation to draw from",
                              "give stretch or differential-evolution a fraction"});
        used = {used.stretch / others, used.differential_evolution / others, 0.0};
    }
    double sum = 0.0;
    for (std::size_t index = 0; index < n_kernels; ++index) {
        const auto kernel = static_cast<Kernel>(index);
        sum += used.of(kernel);
        up_to_[index] = sum;
        if (used.of(kernel) > 0.0) last_ = kernel;
    }
}

Kernel KernelMix::at(double u) const {
    for (std::size_t index = 0; index < static_cast<std::size_t>(last_); ++index)
        if (u < up_to_[index]) return static_cast<Kernel>(index);
    return last_;
}

double stretch_factor(double u) {
    const double root = (stretch_scale - 1.0) * u + 1.0;
    return root * root / stretch_scale;
}

Proposal propose(const KernelMix& mix,
                 const double* position,
                 const Partners& partners,
                 const IndependenceProposal* independence,
                 Stream& stream,
                 double* proposal) {
    switch (mix.at(uniform(stream))) {
        case Kernel::stretch:
            return stretch(position, partners, stream, proposal);
        case Kernel::differential_evolution:
            return differential_evolution(position, partners, stream, proposal);
        case Kernel::independence:
            independence->draw(stream, proposal);
            return {Kernel::independence,
                    independence->log_density(position) - independence->log_density(proposal)};
    }
    ensure(false, "a kernel proposes");
    return {};
}

}  // namespace deviascope
