// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/summary/velocity_offset.h"

#include <Eigen/Cholesky>
#include <algorithm>
#include <cmath>
#include <vector>

#include "deviascope/core/error.h"
#include "deviascope/core/parallel.h"
#include "deviascope/core/physical_constants.h"
#include "deviascope/core/random.h"
#include "deviascope/sky/direction.h"
#include "deviascope/summary/significance.h"
#include "summary/draw_moments.h"

namespace deviascope {
namespace {

constexpr Eigen::Index most_kernels = 5000;
constexpr double least_beyond = 10.0;  // draws that make more than a limit

/// Draws from the reference, one for each draw of the velocity.
Eigen::Matrix3Xd reference_draws(const GaussianPrior& reference,
                                 Eigen::Index n,
                                 std::uint64_t seed) {
    const VectorPrior prior("reference", reference);
    Eigen::Matrix3Xd drawn(3, n);
    for (Eigen::Index draw = 0; draw < n; ++draw) {
        Stream stream(seed, Purpose::reference_draw, 0, static_cast<std::uint64_t>(draw), 0);
        drawn.col(draw) = prior.draw(stream);
    }
    return drawn;
}

void find_angle_and_ratio(const Eigen::Matrix3Xd& velocity,
                          const Eigen::Matrix3Xd& reference,
                          VelocityOffset& offset) {
    std::vector<double> angle, ratio;
    for (Eigen::Index draw = 0; draw < velocity.cols(); ++draw) {
        const Eigen::Vector3d v = velocity.col(draw), r = reference.col(draw);
        if (r.isZero(0.0)) continue;
        ratio.push_back(v.norm() / r.norm());
        if (!v.isZero(0.0)) angle.push_back(separation(v, r) / radians_per_degree);
    }
    offset.angle_deg = estimate_of(std::move(angle));
    offset.speed_ratio = estimate_of(std::move(ratio));
}

/// At most `most` columns, evenly spaced.
Eigen::Matrix3Xd thinned(const Eigen::Matrix3Xd& draws, Eigen::Index most) {
    const Eigen::Index n = std::min(draws.cols(), most);
    Eigen::Matrix3Xd kept(3, n);
    for (Eigen::Index i = 0; i < n; ++i) kept.col(i) = draws.col(i * draws.cols() / n);
    return kept;
}

/// Sum of Gaussian kernels (not normalised) about `centres`, but for the one numbered `but`.
double density_at(const Eigen::Vector3d& at,
                  const Eigen::Matrix3Xd& centres,
                  double width,
                  Eigen::Index but = -1) {
    const double scale = -0.5 / (width * width);
    double sum = 0.0;
    for (Eigen::Index i = 0; i < centres.cols(); ++i)
        if (i != but) sum += std::exp(scale * (centres.col(i) - at).squaredNorm());
    return sum / static_cast<double>(centres.cols() - (but >= 0 ? 1 : 0));
}

void find_shift(const Eigen::Matrix3Xd& differences,
                const DrawMoments& moments,
                double effective_draws,
                int threads,
                VelocityOffset& offset) {
    const Eigen::LLT<Eigen::Matrix3d> factor{Eigen::Matrix3d(moments.covariance)};
    const Eigen::Matrix3Xd kept = thinned(differences, most_kernels);
    if (factor.info() != Eigen::Success || kept.cols() < 2) return;
    const Eigen::Matrix3Xd white =
        factor.matrixL().solve(kept.colwise() - Eigen::Vector3d(moments.mean));
    const Eigen::Vector3d none = factor.matrixL().solve(Eigen::Vector3d(-moments.mean));
    const double n = std::clamp(effective_draws, 1.0, static_cast<double>(white.cols()));
    const double width = std::pow(4.0 / (5.0 * n), 1.0 / 7.0);
    const double at_none = density_at(none, white, width);
    std::vector<char> is_beyond(static_cast<std::size_t>(white.cols()));
    parallel_for(is_beyond.size(), threads, [&](std::size_t i) {
        const auto draw = static_cast<Eigen::Index>(i);
        is_beyond[i] = density_at(white.col(draw), white, width, draw) <= at_none ? 1 : 0;
    });
    const auto beyond = static_cast<double>(std::ranges::count(is_beyond, 1));
    offset.shift_is_limit = beyond < least_beyond;
    offset.shift_probability =
        std::max(beyond, least_beyond) / static_cast<double>(white.cols());
    if (!offset.shift_is_limit)
        offset.shift_probability = beyond / static_cast<double>(white.cols());
    offset.shift_sigma = sigma_of_probability(std::min(offset.shift_probability, 1.0));
}

}  // namespace

GaussianDifference difference_of(const Eigen::Vector3d& difference,
                                 const Eigen::Matrix3d& covariance) {
    // In units of each component's own error: a singular matrix shows whatever its size.
    const Eigen::Vector3d sd = covariance.diagonal().cwiseSqrt();
    if (!(sd.array() > 0.0).all()) return {};
    const Eigen::Vector3d inverse = sd.cwiseInverse();
    const Eigen::LLT<Eigen::Matrix3d> factor(
        Eigen::Matrix3d(inverse.asDiagonal() * covariance * inverse.asDiagonal()));
    if (factor.info() != Eigen::Success) return {};
    GaussianDifference found;
    found.chi2 =
        factor.matrixL().solve(Eigen::Vector3d(inverse.cwiseProduct(difference))).squaredNorm();
    found.probability = exceedance_of_chi_square(found.chi2, 3.0);
    found.sigma = sigma_of_chi_square(found.chi2, 3.0);
    return found;
}

VelocityOffset offset_from(const Eigen::Matrix3Xd& velocity,
                           double effective_draws,
                           const GaussianPrior& reference,
                           std::uint64_t seed,
                           int threads) {
    ensure(velocity.cols() > 0, "an offset is found from draws");
    VelocityOffset offset;
    const Eigen::Matrix3Xd references = reference_draws(reference, velocity.cols(), seed);
    find_angle_and_ratio(velocity, references, offset);
    const DrawMoments own = moments_of(velocity);
    offset.difference = own.mean - reference.mean;
    if (velocity.cols() < 4 || !(own.covariance.diagonal().array() > 0.0).all()) return offset;
    const GaussianDifference gaussian = difference_of(
        offset.difference, Eigen::Matrix3d(own.covariance) + reference.covariance);
    offset.chi2 = gaussian.chi2;
    offset.probability = gaussian.probability;
    offset.sigma = gaussian.sigma;
    const Eigen::Matrix3Xd differences = velocity - references;
    find_shift(differences, moments_of(differences), effective_draws, threads, offset);
    return offset;
}

}  // namespace deviascope
