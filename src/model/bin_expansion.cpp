// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/bin_expansion.h"

#include <cmath>

#include "deviascope/sky/pixelisation.h"
#include "model/lorentz.h"

namespace deviascope {
namespace {

/// A bin at given parameters.
struct Point {
    Eigen::Vector3d velocity, dipole;  ///< beta, r D
    double bias_ratio, weight, log_gamma, gamma_squared;
};

Point point_of(const BinTerm& term, const Eigen::Ref<const Eigen::VectorXd>& row) {
    Point point;
    point.velocity = row.head<3>();
    point.dipole = term.bias_ratio * row.segment<3>(term.intrinsic);
    point.bias_ratio = term.bias_ratio;
    point.weight = row[term.weight];
    point.log_gamma = log_lorentz_factor(point.velocity);
    point.gamma_squared = 1.0 / (1.0 - point.velocity.squaredNorm());
    return point;
}

/// y = ln(lambda / lambda0) in the direction n, to second order:
///   y = -B (ln gamma + ln(1 - beta.n)) + ln(1 + r D.n)
struct Local {
    double value;
    BinVector gradient;
    BinMatrix hessian;
};

Local local_at(const Point& at, const Direction& n) {
    const double near = 1.0 - at.velocity.dot(n), dipole = 1.0 + at.dipole.dot(n);
    const double log_delta = -at.log_gamma - std::log1p(-at.velocity.dot(n));
    const Eigen::Vector3d of_velocity = n / near - at.gamma_squared * at.velocity;
    const Eigen::Vector3d of_dipole = at.bias_ratio * n / dipole;
    Local local;
    local.value = at.weight * log_delta + std::log1p(at.dipole.dot(n));
    local.gradient << at.weight * of_velocity, of_dipole, log_delta;
    local.hessian.setZero();
    const double g2 = at.gamma_squared;
    local.hessian.topLeftCorner<3, 3>() =
        at.weight * (n * n.transpose() / (near * near) - g2 * Eigen::Matrix3d::Identity() -
                     2.0 * g2 * g2 * at.velocity * at.velocity.transpose());
    local.hessian.block<3, 3>(3, 3) = -of_dipole * of_dipole.transpose();
    local.hessian.block<3, 1>(0, 6) = of_velocity;
    local.hessian.block<1, 3>(6, 0) = of_velocity.transpose();
    return local;
}

}  // namespace

BinExpansion pixel_expansion(const Counts& counts,
                             const BinTerm& term,
                             const Eigen::Ref<const Eigen::VectorXd>& row) {
    const Pixelisation grid(counts.nside);
    const SurveyCounts& survey = counts.surveys[term.survey];
    const BinCounts& bin = survey.bins[term.bin];
    const Footprint& footprint = survey.footprints[bin.footprint];
    const Point point = point_of(term, row);
    BinExpansion sums;
    double exposed = 0.0, expected = 0.0;
    for (std::size_t p = 0; p < bin.count.size(); ++p) {
        const Local local = local_at(point, grid.centre(footprint.pixel[p]));
        const double n = static_cast<double>(bin.count[p]);
        sums.counted += n * local.value;
        sums.counted_gradient += n * local.gradient;
        sums.counted_hessian += n * local.hessian;
        const double e = footprint.exposure[p] * std::exp(local.value);
        exposed += footprint.exposure[p];
        expected += e;
        sums.log_expected_gradient += e * local.gradient;
        sums.log_expected_hessian +=
            e * (local.hessian + local.gradient * local.gradient.transpose());
    }
    sums.log_expected = std::log(expected / exposed);
    sums.log_expected_gradient /= expected;
    sums.log_expected_hessian /= expected;
    sums.log_expected_hessian -=
        sums.log_expected_gradient * sums.log_expected_gradient.transpose();
    return sums;
}

BinLogLikelihood log_likelihood_of(const BinExpansion& expansion,
                                   const BinTotals& totals,
                                   const MonopolePrior& prior,
                                   double monopole) {
    const BinVector& slope = expansion.log_expected_gradient;
    const double balance =
        expansion.counted - totals.sources * totals.dispersion * expansion.log_expected;
    BinLogLikelihood all;
    all.value = log_likelihood_of(totals, prior, monopole, balance, expansion.log_expected);
    all.gradient.setZero();
    all.hessian.setZero();
    auto gradient = all.gradient.head<n_bin_variables>();
    auto hessian = all.hessian.topLeftCorner<n_bin_variables, n_bin_variables>();
    gradient = expansion.counted_gradient / totals.dispersion;
    hessian = expansion.counted_hessian / totals.dispersion;
    const double expected = totals.exposed * std::exp(expansion.log_expected);
    if (prior.sampled) {
        const double sources = monopole * expected;
        gradient -= sources * slope;
        hessian -= sources * (expansion.log_expected_hessian + slope * slope.transpose());
        all.gradient[n_bin_variables] = totals.sources - sources;
        all.hessian(n_bin_variables, n_bin_variables) = -sources;
        all.hessian.col(n_bin_variables).head<n_bin_variables>() = -sources * slope;
        all.hessian.row(n_bin_variables).head<n_bin_variables>() = -sources * slope;
        return all;
    }
    const double share = expected / (expected + prior.rate);
    const double sources = (totals.sources + prior.shape) * share;
    gradient -= sources * slope;
    hessian -=
        sources * (expansion.log_expected_hessian + (1.0 - share) * slope * slope.transpose());
    return all;
}

}  // namespace deviascope
