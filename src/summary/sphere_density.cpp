// SPDX-License-Identifier: GPL-2.0-or-later
#include "summary/sphere_density.h"

#include <algorithm>
#include <cmath>
#include <numbers>
#include <numeric>

namespace deviascope {
namespace {

constexpr double pi = std::numbers::pi;
constexpr int coarsest_nside = 8, coarsest_table_nside = 32, finest_nside = 64;
constexpr int block_nside = 4;
constexpr double kernel_reach = 5.0;  // bandwidths; what lies beyond is 4e-6 of the mass
constexpr double lobe_cut = 0.5 * 2.5 * 2.5;
constexpr double gaussian_lobe = 0.7525;  // t = 1 - x / (exp(x) - 1), x = lobe_cut t
constexpr int rounds_of_scale = 3;
constexpr int steps_to_peak = 20;

double expm1_of(double x) {
    return std::expm1(x);
}

/// Side of a cell of a given nside, radians.
double cell_side(int nside) {
    return std::sqrt(pi / 3.0) / nside;
}

/// The coarsest nside, from `least` to 64, whose cells are not larger than `side`.
int nside_for(double side, int least) {
    int nside = least;
    while (nside < finest_nside && cell_side(nside) > side) nside *= 2;
    return nside;
}

/// Scale of the lobe around `peak`; see the header.
double lobe_scale(const SphereCells& cells, const Direction& peak) {
    const Eigen::ArrayXd distance = 1.0 - (cells.mean().matrix() * peak).array();
    std::vector<Eigen::Index> order(static_cast<std::size_t>(cells.size()));
    std::iota(order.begin(), order.end(), 0);
    std::sort(order.begin(), order.end(), [&](Eigen::Index a, Eigen::Index b) {
        return distance[a] < distance[b];
    });
    constexpr double least_share = 0.02;
    double limit = 0.0, mean = 0.0, before = -1.0;
    while (mean > before) {
        before = mean;
        double share = 0.0, sum = 0.0;
        for (const Eigen::Index cell : order) {
            if (distance[cell] > limit && share >= least_share) break;
            share += cells.weight()[cell];
            sum += cells.weight()[cell] * distance[cell];
        }
        mean = sum / share;
        limit = lobe_cut * mean;
    }
    return std::sqrt(mean / gaussian_lobe);
}

double scale_of_all(double mean_length) {
    const double squared = mean_length * mean_length;
    return std::sqrt((1.0 - squared) / (mean_length * (3.0 - squared)));
}

/// Kernel of the final bandwidth: the densest lobe is sought anew with each better scale.
SphereKernel settled_kernel(std::span<const Direction> draws,
                            double mean_length,
                            double effective_draws) {
    const double shrink = 1.3 * std::pow(effective_draws, -1.0 / 6.0);
    const double widest = std::min(scale_of_all(mean_length), std::sqrt(1.0 / gaussian_lobe));
    double scale = widest;
    for (int round = 0; round < rounds_of_scale; ++round) {
        const SphereKernel kernel(draws, shrink * scale);
        scale = std::min(widest, lobe_scale(kernel.cells(), kernel.peak()));
    }
    return SphereKernel(draws, shrink * scale);
}

}  // namespace

SphereCells::SphereCells(std::span<const Direction> draws, int nside) {
    const Pixelisation grid(nside);
    gather(draws, grid);
}

void SphereCells::gather(std::span<const Direction> draws, const Pixelisation& grid) {
    std::vector<std::int64_t> pixel(draws.size());
    grid.pixels_at(draws, pixel);
    Eigen::ArrayX3d sum = Eigen::ArrayX3d::Zero(grid.n_pixels(), 3);
    Eigen::ArrayXd number = Eigen::ArrayXd::Zero(grid.n_pixels());
    for (std::size_t draw = 0; draw < draws.size(); ++draw) {
        sum.row(pixel[draw]) += draws[draw].array().transpose();
        number[pixel[draw]] += 1.0;
    }
    const Eigen::Index occupied = (number > 0.0).count();
    mean_.resize(occupied, 3);
    weight_.resize(occupied);
    const Pixelisation coarse(block_nside);
    Eigen::Index cell = 0;
    for (std::int64_t block = 0; block < coarse.n_pixels(); ++block) {
        const Eigen::Index first = cell;
        for (const std::int64_t child : coarse.children(block, grid)) {
            if (number[child] == 0.0) continue;
            mean_.row(cell) = sum.row(child) / number[child];
            weight_[cell++] = number[child] / static_cast<double>(draws.size());
        }
        if (cell > first) close_block(first, cell);
    }
}

void SphereCells::close_block(Eigen::Index first, Eigen::Index last) {
    const auto members = mean_.middleRows(first, last - first);
    const Direction centre = members.colwise().sum().matrix().transpose().normalized();
    double radius = 0.0;
    for (Eigen::Index member = 0; member < members.rows(); ++member)
        radius = std::max(
            radius, separation(centre, Direction(members.row(member).matrix().transpose())));
    blocks_.push_back({first, last - first, centre, radius});
}

SphereKernel::SphereKernel(std::span<const Direction> draws, double bandwidth)
    : cells_(draws, nside_for(0.7 * bandwidth, coarsest_nside)),
      bandwidth_(std::max(bandwidth, cell_side(finest_nside))),
      concentration_(1.0 / (bandwidth_ * bandwidth_)) {
    const Eigen::ArrayXd own = concentration_ * cells_.mean().square().rowwise().sum().sqrt();
    height_ = cells_.weight() * own / (-2.0 * pi * (-2.0 * own).unaryExpr(&expm1_of)) *
              (concentration_ - own).exp();
    for (const SphereCells::Block& block : cells_.blocks()) {
        const double reach = kernel_reach * bandwidth_ + block.radius;
        block_cosine_.push_back(reach < pi ? std::cos(reach) : -2.0);
    }
}

template <class Visit>
void SphereKernel::visit_near(const Direction& direction, const Visit& visit) const {
    for (std::size_t block = 0; block < block_cosine_.size(); ++block) {
        const SphereCells::Block& cells = cells_.blocks()[block];
        if (cells.centre.dot(direction) < block_cosine_[block]) continue;
        const auto mean = cells_.mean().middleRows(cells.first, cells.size);
        const auto height = height_.segment(cells.first, cells.size);
        visit(mean,
              height *
                  (concentration_ * (mean.col(0) * direction.x() + mean.col(1) * direction.y() +
                                     mean.col(2) * direction.z() - 1.0))
                      .exp());
    }
}

double SphereKernel::at(const Direction& direction) const {
    double sum = 0.0;
    visit_near(direction, [&](const auto&, const auto& term) { sum += term.sum(); });
    return sum;
}

double SphereKernel::at(const Direction& direction, Eigen::Vector3d& gradient) const {
    double sum = 0.0;
    Eigen::Vector3d pull = Eigen::Vector3d::Zero();
    visit_near(direction, [&](const auto& mean, const auto& term) {
        const Eigen::ArrayXd value = term;
        sum += value.sum();
        pull += mean.matrix().transpose() * value.matrix();
    });
    gradient = concentration_ * (pull - pull.dot(direction) * direction);
    return sum;
}

Direction SphereKernel::peak() const {
    Direction best = Direction::UnitZ();
    double highest = -1.0;
    for (Eigen::Index cell = 0; cell < cells_.size(); ++cell) {
        const Direction place = cells_.mean().row(cell).matrix().transpose().normalized();
        const double value = at(place);
        if (value > highest) highest = value, best = place;
    }
    // Mean shift: each step goes to the mean of the draws under the kernel and never descends
    // (Fukunaga & Hostetler 1975, IEEE Trans. Inf. Theory 21, 32).
    for (int step = 0; step < steps_to_peak; ++step) {
        Eigen::Vector3d gradient;
        const double value = at(best, gradient);
        best = (best + gradient / (concentration_ * value)).normalized();
    }
    return best;
}

SphereDensity::SphereDensity(std::span<const Direction> draws,
                             double mean_length,
                             double effective_draws)
    : kernel_(settled_kernel(draws, mean_length, effective_draws)),
      grid_(nside_for(0.25 * kernel_.bandwidth(), coarsest_table_nside)),
      centre_(grid_.centres()) {
    value_.resize(std::ssize(centre_));
    gradient_.resize(3, std::ssize(centre_));
    for (Eigen::Index pixel = 0; pixel < value_.size(); ++pixel) {
        Eigen::Vector3d gradient;
        value_[pixel] = kernel_.at(centre_[static_cast<std::size_t>(pixel)], gradient);
        gradient_.col(pixel) = gradient;
    }
}

std::vector<double> SphereDensity::at_each(std::span<const Direction> draws) const {
    std::vector<std::int64_t> pixel(draws.size());
    grid_.pixels_at(draws, pixel);
    std::vector<double> density(draws.size());
    for (std::size_t draw = 0; draw < draws.size(); ++draw) {
        const auto at = static_cast<std::size_t>(pixel[draw]);
        const Eigen::Vector3d offset = draws[draw] - centre_[at];
        density[draw] = value_[pixel[draw]] + gradient_.col(pixel[draw]).dot(offset);
    }
    return density;
}

double SphereDensity::area_above(double level) const {
    const double side = std::sqrt(grid_.solid_angle());
    double cells = 0.0;
    for (Eigen::Index pixel = 0; pixel < value_.size(); ++pixel) {
        // The level line crosses a cell as a straight line; a ramp as wide as the cell is its
        // covered share, exact for a square crossed along an axis.
        const double change = gradient_.col(pixel).norm() * side;
        const double above = value_[pixel] - level;
        if (std::abs(above) >= 0.5 * change)
            cells += above > 0.0 ? 1.0 : 0.0;
        else
            cells += 0.5 + above / change;
    }
    return cells * grid_.solid_angle();
}

}  // namespace deviascope
