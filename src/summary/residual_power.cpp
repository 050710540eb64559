// SPDX-License-Identifier: GPL-2.0-or-later
#include "summary/residual_power.h"

#include <Eigen/Cholesky>
#include <Eigen/Eigenvalues>
#include <limits>

namespace deviascope {
namespace {

constexpr int n_absorbed = 4;    // monopole and dipole
constexpr int n_harmonics = 21;  // 5 + 7 + 9
using Absorbed = Eigen::Matrix<double, n_absorbed, 1>;
using Harmonics = Eigen::Matrix<double, n_harmonics, 1>;

Absorbed absorbed_at(const Direction& n) {
    return {1.0, n.x(), n.y(), n.z()};
}

/// Real harmonic polynomials of degree 2, 3 and 4 on the sphere, each degree spanned (their
/// scales do not matter to a chi-square).
Harmonics harmonics_at(const Direction& n) {
    const double x = n.x(), y = n.y(), z = n.z();
    const double xx = x * x, yy = y * y, zz = z * z;
    Harmonics value;
    value << x * y, y * z, x * z, xx - yy, 3.0 * zz - 1.0,  //
        z * (5.0 * zz - 3.0), x * (5.0 * zz - 1.0), y * (5.0 * zz - 1.0), z * (xx - yy),
        x * y * z, x * (xx - 3.0 * yy), y * (3.0 * xx - yy),  //
        zz * (35.0 * zz - 30.0) + 3.0, x * z * (7.0 * zz - 3.0), y * z * (7.0 * zz - 3.0),
        (xx - yy) * (7.0 * zz - 1.0), x * y * (7.0 * zz - 1.0), x * z * (xx - 3.0 * yy),
        y * z * (3.0 * xx - yy), xx * (xx - 3.0 * yy) - yy * (3.0 * xx - yy), x * y * (xx - yy);
    return value;
}

/// Sums over pixels: of the residuals, and of the Poisson covariance of these.
struct ResidualSums {
    Absorbed absorbed = Absorbed::Zero();
    Harmonics harmonics = Harmonics::Zero();
    Eigen::Matrix<double, n_absorbed, n_absorbed> absorbed_square =
        Eigen::Matrix<double, n_absorbed, n_absorbed>::Zero();
    Eigen::Matrix<double, n_absorbed, n_harmonics> across =
        Eigen::Matrix<double, n_absorbed, n_harmonics>::Zero();
    Eigen::Matrix<double, n_harmonics, n_harmonics> square =
        Eigen::Matrix<double, n_harmonics, n_harmonics>::Zero();
};

ResidualSums sums_of(const Footprint& footprint,
                     const BinCounts& bin,
                     const std::vector<double>& expected,
                     const Pixelisation& grid) {
    ResidualSums sums;
    for (std::size_t p = 0; p < expected.size(); ++p) {
        const Direction n = grid.centre(footprint.pixel[p]);
        const Absorbed low = absorbed_at(n);
        const Harmonics high = harmonics_at(n);
        const double residual = static_cast<double>(bin.count[p]) - expected[p];
        sums.absorbed += residual * low;
        sums.harmonics += residual * high;
        sums.absorbed_square.noalias() += expected[p] * low * low.transpose();
        sums.across.noalias() += expected[p] * low * high.transpose();
        sums.square.noalias() += expected[p] * high * high.transpose();
    }
    return sums;
}

double chi_square(const Eigen::VectorXd& amplitude, const Eigen::MatrixXd& covariance) {
    constexpr double singular = 1e-10;
    const Eigen::VectorXd scale = covariance.diagonal().cwiseSqrt().cwiseInverse();
    if (!scale.allFinite()) return std::numeric_limits<double>::quiet_NaN();
    const Eigen::SelfAdjointEigenSolver<Eigen::MatrixXd> solver(
        Eigen::MatrixXd(scale.asDiagonal() * covariance * scale.asDiagonal()));
    if (!(solver.eigenvalues().minCoeff() > singular))
        return std::numeric_limits<double>::quiet_NaN();
    const Eigen::VectorXd along =
        solver.eigenvectors().transpose() * Eigen::VectorXd(scale.cwiseProduct(amplitude));
    return (along.array().square() / solver.eigenvalues().array()).sum();
}

}  // namespace

std::array<ResidualPower, 3> residual_power(const Footprint& footprint,
                                            const BinCounts& bin,
                                            const std::vector<double>& expected,
                                            const Pixelisation& grid) {
    const ResidualSums sums = sums_of(footprint, bin, expected, grid);
    // What of each harmonic a monopole and a dipole can absorb, under the expected counts.
    const Eigen::LDLT<Eigen::Matrix4d> low(sums.absorbed_square);
    const Eigen::Matrix<double, n_absorbed, n_harmonics> absorbed = low.solve(sums.across);
    const Harmonics amplitude = sums.harmonics - absorbed.transpose() * sums.absorbed;
    const Eigen::MatrixXd covariance = sums.square - sums.across.transpose() * absorbed;

    std::array<ResidualPower, 3> power;
    Eigen::Index first = 0;
    for (std::size_t i = 0; i < power.size(); ++i) {
        power[i].multipole = static_cast<int>(i) + 2;
        const Eigen::Index n = 2 * power[i].multipole + 1;
        power[i].chi2 =
            chi_square(amplitude.segment(first, n), covariance.block(first, first, n, n));
        first += n;
    }
    return power;
}

}  // namespace deviascope
