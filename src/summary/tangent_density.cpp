// SPDX-License-Identifier: GPL-2.0-or-later
#include "summary/tangent_density.h"

#include <Eigen/Eigenvalues>
#include <algorithm>
#include <cmath>

#include "deviascope/summary/interval.h"

namespace deviascope {
namespace {

constexpr double cells_per_bandwidth = 4.0;
constexpr double kernel_reach = 4.5;  // bandwidths; what lies beyond is 4e-5 of the mass
constexpr Eigen::Index most_cells = 1024;
constexpr double tail_probability = 0.995;
constexpr double tail_deviations = 10.0;

constexpr double central_share = 0.9;
/// Variance of the central 90 % of a two-dimensional standard normal: 1 + 0.1 ln(0.1) / 0.9.
constexpr double central_variance = 0.7441572118;
constexpr int rounds_of_whitening = 3;

/// Unit vector at right angles to another.
Direction right_angle_to(const Direction& direction) {
    const Direction helper =
        std::abs(direction.z()) < 0.9 ? Direction::UnitZ() : Direction::UnitX();
    return helper.cross(direction).normalized();
}

std::vector<double> radii_of(const Eigen::Matrix2Xd& points) {
    std::vector<double> radius(static_cast<std::size_t>(points.cols()));
    Eigen::Map<Eigen::RowVectorXd>(radius.data(), points.cols()) = points.colwise().norm();
    return radius;
}

double radius_holding(std::vector<double> radius, double probability) {
    const auto place =
        static_cast<std::ptrdiff_t>(draws_holding(radius.size(), probability)) - 1;
    std::nth_element(radius.begin(), radius.begin() + place, radius.end());
    return radius[static_cast<std::size_t>(place)];
}

/// Convolution of each row of nodes (second index) with a symmetric kernel, zero outside.
Eigen::ArrayXXd convolved(const Eigen::ArrayXXd& grid, const Eigen::ArrayXd& kernel) {
    const Eigen::Index reach = kernel.size() / 2;
    Eigen::ArrayXXd result = Eigen::ArrayXXd::Zero(grid.rows(), grid.cols());
    for (Eigen::Index to = 0; to < grid.cols(); ++to) {
        const Eigen::Index first = std::max<Eigen::Index>(0, to - reach);
        const Eigen::Index last = std::min(grid.cols() - 1, to + reach);
        for (Eigen::Index from = first; from <= last; ++from)
            result.col(to) += kernel[from - to + reach] * grid.col(from);
    }
    return result;
}

/// Gaussian weights at whole steps of `cell`, adding to 1.
Eigen::ArrayXd gaussian_kernel(double bandwidth, double cell) {
    // Sharing a draw among its four nodes has already spread it by cell^2 / 6.
    const double sd =
        std::sqrt(std::max(bandwidth * bandwidth - cell * cell / 6.0, 1e-6 * cell * cell));
    const auto reach = static_cast<Eigen::Index>(std::ceil(kernel_reach * bandwidth / cell));
    Eigen::ArrayXd kernel(2 * reach + 1);
    for (Eigen::Index step = -reach; step <= reach; ++step) {
        const double x = static_cast<double>(step) * cell / sd;
        kernel[step + reach] = std::exp(-0.5 * x * x);
    }
    return kernel / kernel.sum();
}

/// Share of a triangle where the linear function with these corner values exceeds `level`.
double triangle_share(double a, double b, double c, double level) {
    if (a > b) std::swap(a, b);
    if (b > c) std::swap(b, c);
    if (a > b) std::swap(a, b);
    if (level < a) return 1.0;
    if (level >= c) return 0.0;
    if (level < b) return 1.0 - (level - a) / (b - a) * ((level - a) / (c - a));
    return (c - level) / (c - b) * ((c - level) / (c - a));
}

/// Share of a cell above the level: four triangles that meet at the mean of the corners.
double cell_share(double a, double b, double c, double d, double level) {
    if (std::min({a, b, c, d}) > level) return 1.0;
    if (std::max({a, b, c, d}) <= level) return 0.0;
    const double middle = 0.25 * (a + b + c + d);
    return 0.25 * (triangle_share(a, b, middle, level) + triangle_share(b, c, middle, level) +
                   triangle_share(c, d, middle, level) + triangle_share(d, a, middle, level));
}

}  // namespace

TangentPlane::TangentPlane(const Direction& centre)
    : centre_(centre),
      first_axis_(right_angle_to(centre)),
      second_axis_(centre.cross(first_axis_)) {}

Eigen::Vector2d TangentPlane::project(const Direction& direction) const {
    const double one_plus_cosine = 1.0 + centre_.dot(direction);
    if (one_plus_cosine < 1e-15) return {2.0, 0.0};
    const double scale = std::sqrt(2.0 / one_plus_cosine);
    return {scale * first_axis_.dot(direction), scale * second_axis_.dot(direction)};
}

TangentDensity::TangentDensity(std::span<const Direction> draws,
                               const Direction& centre,
                               double effective_draws)
    : plane_(centre) {
    Eigen::Matrix2Xd points(2, std::ssize(draws));
    for (Eigen::Index draw = 0; draw < points.cols(); ++draw)
        points.col(draw) = plane_.project(draws[static_cast<std::size_t>(draw)]);
    points = whiten(points);
    const double bandwidth = 1.2 * std::pow(effective_draws, -1.0 / 6.0);
    lay_grid(points,
             bandwidth,
             std::max(tail_deviations, radius_holding(radii_of(points), tail_probability)));
    smooth(points, bandwidth);
}

Eigen::Matrix2Xd TangentDensity::whiten(const Eigen::Matrix2Xd& plane) {
    Eigen::VectorXd central = Eigen::VectorXd::Ones(plane.cols());
    double scale = 1.0;
    Eigen::Matrix2Xd whitened;
    for (int round = 0; round <= rounds_of_whitening; ++round) {
        const Eigen::Vector2d mean = plane * central / central.sum();
        const Eigen::Matrix2Xd centred = plane.colwise() - mean;
        set_whitening(
            mean,
            centred * central.asDiagonal() * centred.transpose() / (central.sum() * scale));
        whitened = whitening_ * centred;
        const std::vector<double> radius = radii_of(whitened);
        const double limit = radius_holding(radius, central_share);
        for (Eigen::Index draw = 0; draw < central.size(); ++draw)
            central[draw] = radius[static_cast<std::size_t>(draw)] <= limit ? 1.0 : 0.0;
        scale = central_variance;
    }
    return whitened;
}

void TangentDensity::set_whitening(const Eigen::Vector2d& mean,
                                   const Eigen::Matrix2d& covariance) {
    mean_ = mean;
    const Eigen::SelfAdjointEigenSolver<Eigen::Matrix2d> axes(covariance);
    // Draws along a line or in one point: as wide as unit vectors can resolve.
    const double least = std::max(1e-12 * axes.eigenvalues()[1], 1e-32);
    const Eigen::Vector2d sd = axes.eigenvalues().cwiseMax(least).cwiseSqrt();
    whitening_ = sd.cwiseInverse().asDiagonal() * axes.eigenvectors().transpose();
    steradian_per_unit_ = sd.prod();
}

void TangentDensity::lay_grid(const Eigen::Matrix2Xd& whitened,
                              double bandwidth,
                              double half_width) {
    const double padding = (kernel_reach + 1.0) * bandwidth;
    const Eigen::Array2d low = whitened.rowwise().minCoeff().array().max(-half_width) - padding;
    const Eigen::Array2d high = whitened.rowwise().maxCoeff().array().min(half_width) + padding;
    const Eigen::Array2d side = high - low;
    cell_ = std::max(bandwidth / cells_per_bandwidth,
                     side.maxCoeff() / static_cast<double>(most_cells - 2));
    corner_ = low;
    density_ = Eigen::ArrayXXd::Zero(static_cast<Eigen::Index>(std::ceil(side[0] / cell_)) + 2,
                                     static_cast<Eigen::Index>(std::ceil(side[1] / cell_)) + 2);
}

bool TangentDensity::locate(const Eigen::Vector2d& whitened, Place& place) const {
    const Eigen::Array2d cells = (whitened.array() - corner_) / cell_;
    const Eigen::Array2d last(static_cast<double>(density_.rows() - 1),
                              static_cast<double>(density_.cols() - 1));
    if ((cells < 0.0).any() || (cells >= last).any()) return false;
    place.x = static_cast<Eigen::Index>(cells[0]);
    place.y = static_cast<Eigen::Index>(cells[1]);
    place.right = cells[0] - static_cast<double>(place.x);
    place.upper = cells[1] - static_cast<double>(place.y);
    return true;
}

void TangentDensity::smooth(const Eigen::Matrix2Xd& whitened, double bandwidth) {
    Place at;
    for (const auto& draw : whitened.colwise()) {
        if (!locate(draw, at)) continue;
        density_(at.x, at.y) += (1.0 - at.right) * (1.0 - at.upper);
        density_(at.x + 1, at.y) += at.right * (1.0 - at.upper);
        density_(at.x, at.y + 1) += (1.0 - at.right) * at.upper;
        density_(at.x + 1, at.y + 1) += at.right * at.upper;
    }
    const Eigen::ArrayXd kernel = gaussian_kernel(bandwidth, cell_);
    for (int axis = 0; axis < 2; ++axis)
        density_ = convolved(density_, kernel).transpose().eval();
    density_ /= static_cast<double>(whitened.cols()) * cell_ * cell_ * steradian_per_unit_;
}

double TangentDensity::at(const Direction& direction) const {
    Place at;
    if (!locate(whitening_ * (plane_.project(direction) - mean_), at)) return 0.0;
    const auto row = density_.block<2, 2>(at.x, at.y);
    return (1.0 - at.upper) * ((1.0 - at.right) * row(0, 0) + at.right * row(1, 0)) +
           at.upper * ((1.0 - at.right) * row(0, 1) + at.right * row(1, 1));
}

std::vector<double> TangentDensity::at_each(std::span<const Direction> draws) const {
    std::vector<double> density(draws.size());
    std::transform(draws.begin(), draws.end(), density.begin(), [&](const Direction& draw) {
        return at(draw);
    });
    return density;
}

double TangentDensity::area_above(double level) const {
    double cells = 0.0;
    for (Eigen::Index y = 0; y + 1 < density_.cols(); ++y)
        for (Eigen::Index x = 0; x + 1 < density_.rows(); ++x)
            cells += cell_share(density_(x, y),
                                density_(x + 1, y),
                                density_(x + 1, y + 1),
                                density_(x, y + 1),
                                level);
    return cells * cell_ * cell_ * steradian_per_unit_;
}

}  // namespace deviascope
