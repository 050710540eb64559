// SPDX-License-Identifier: GPL-2.0-or-later
// The log-likelihood of one walker in 80-bit arithmetic, written straight from its definition.
#pragma once

#include <cmath>

#include "deviascope/counts/count_map.h"
#include "deviascope/model/parameter_space.h"
#include "deviascope/sky/pixelisation.h"

namespace exact {

using Real = long double;

/// X_b and E_b / E0_b of a bin.
struct BinSums {
    Real counted = 0, ratio = 0, exposed_sky = 0;
};

inline BinSums sums_of(const deviascope::Counts& counts,
                       const deviascope::BinTerm& term,
                       const Eigen::VectorXd& row) {
    const deviascope::Pixelisation grid(counts.nside);
    const auto& survey = counts.surveys[term.survey];
    const auto& bin = survey.bins[term.bin];
    const auto& footprint = survey.footprints[bin.footprint];
    Real speed_squared = 0;
    for (int c = 0; c < 3; ++c) speed_squared += Real(row[c]) * Real(row[c]);
    const Real log_gamma = -std::log1p(-speed_squared) / 2;
    BinSums sums;
    for (std::size_t p = 0; p < bin.count.size(); ++p) {
        const deviascope::Direction n = grid.centre(footprint.pixel[p]);
        Real approaching = 0, dipole = 0;
        for (int c = 0; c < 3; ++c) {
            approaching += Real(row[c]) * Real(n[c]);
            dipole += Real(term.bias_ratio) * Real(row[term.intrinsic + c]) * Real(n[c]);
        }
        const Real y = -Real(row[term.weight]) * (log_gamma + std::log1p(-approaching)) +
                       std::log1p(dipole);
        sums.counted += Real(bin.count[p]) * y;
        sums.ratio += Real(footprint.exposure[p]) * std::exp(y);
        sums.exposed_sky += Real(footprint.exposure[p]);
    }
    sums.ratio /= sums.exposed_sky;
    sums.exposed_sky *= Real(grid.solid_angle());
    return sums;
}

/// One bin; the monopole integrated out under Gamma(a, b), or given in the row.
inline Real log_likelihood_of_term(const deviascope::Counts& counts,
                                   const deviascope::ParameterSpace& space,
                                   const deviascope::BinTerm& term,
                                   const Eigen::VectorXd& row) {
    const deviascope::MonopolePrior& prior = space.options().monopole;
    const BinSums bin = sums_of(counts, term, row);
    const Real phi = term.dispersion;
    const Real n = Real(counts.surveys[term.survey].bins[term.bin].total()) / phi;
    const Real e0 = bin.exposed_sky / phi;
    if (prior.sampled) {
        const Real monopole = row[term.monopole];
        return bin.counted / phi + n * std::log(monopole * e0 / n) -
               (monopole * e0 * bin.ratio - n);
    }
    return bin.counted / phi -
           (n + prior.shape) * std::log((e0 * bin.ratio + prior.rate) / (e0 + prior.rate));
}

inline Real log_likelihood(const deviascope::Counts& counts,
                           const deviascope::ParameterSpace& space,
                           const Eigen::VectorXd& row) {
    Real sum = 0;
    for (const deviascope::BinTerm& term : space.terms())
        sum += log_likelihood_of_term(counts, space, term, row);
    return sum;
}

}  // namespace exact
