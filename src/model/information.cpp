// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/model/information.h"

#include <Eigen/Eigenvalues>
#include <array>
#include <cmath>

#include "deviascope/sky/pixelisation.h"
#include "model/lorentz.h"

namespace deviascope {
namespace {

constexpr int n_local = 8;  // velocity, intrinsic, weight, ln M: what one bin depends on
using LocalVector = Eigen::Matrix<double, n_local, 1>;
using LocalMatrix = Eigen::Matrix<double, n_local, n_local>;

/// A bin at given parameters.
struct BinPoint {
    Eigen::Vector3d velocity, dipole;  ///< beta, r D
    double bias_ratio = 1.0, weight = 0.0, log_gamma = 0.0;
};

BinPoint point_of(const BinTerm& term, const Eigen::Ref<const Eigen::VectorXd>& parameters) {
    BinPoint point;
    point.velocity = parameters.head<3>();
    point.dipole = term.bias_ratio * parameters.segment<3>(term.intrinsic);
    point.bias_ratio = term.bias_ratio;
    point.weight = parameters[term.weight];
    point.log_gamma = log_lorentz_factor(point.velocity);
    return point;
}

/// y = ln(lambda / lambda0) in the direction n, and its derivatives.
struct Gradient {
    double y = 0.0;
    LocalVector value;
};

Gradient gradient_at(const BinPoint& at, const Direction& n) {
    const double approaching = at.velocity.dot(n);
    const double dipole = at.dipole.dot(n);
    const double log_delta =
        -at.log_gamma - std::log1p(-approaching);  // ln of the Doppler factor
    const double gamma_squared = 1.0 / (1.0 - at.velocity.squaredNorm());
    Gradient gradient;
    gradient.y = at.weight * log_delta + std::log1p(dipole);
    gradient.value << at.weight * (n / (1.0 - approaching) - gamma_squared * at.velocity),
        at.bias_ratio * n / (1.0 + dipole), log_delta, 1.0;
    return gradient;
}

/// sum of a, a g and a g g^T for a = n_p and a = w_p exp(y_p).
struct LocalSums {
    double exposed = 0.0;
    LocalVector counted_gradient = LocalVector::Zero();
    LocalVector exposed_gradient = LocalVector::Zero();
    LocalMatrix exposed_square = LocalMatrix::Zero();
};

LocalSums sums_of(const BinCounts& bin,
                  const Footprint& footprint,
                  const Pixelisation& grid,
                  const BinPoint& point) {
    LocalSums sums;
    for (std::size_t p = 0; p < bin.count.size(); ++p) {
        const Gradient gradient = gradient_at(point, grid.centre(footprint.pixel[p]));
        const double exposed = footprint.exposure[p] * std::exp(gradient.y);
        sums.exposed += exposed;
        sums.counted_gradient += static_cast<double>(bin.count[p]) * gradient.value;
        sums.exposed_gradient += exposed * gradient.value;
        sums.exposed_square.noalias() += exposed * gradient.value * gradient.value.transpose();
    }
    return sums;
}

std::array<Eigen::Index, n_local> places_of(const BinTerm& term) {
    const Eigen::Index d = term.intrinsic;
    return {0, 1, 2, d, d + 1, d + 2, term.weight, term.monopole};
}

void add(const BinTerm& term,
         const LocalVector& score,
         const LocalMatrix& information,
         Derivatives& all) {
    const std::array<Eigen::Index, n_local> place = places_of(term);
    for (int row = 0; row < n_local; ++row) {
        const auto r = static_cast<std::size_t>(row);
        all.score[place[r]] += score[row];
        for (int column = 0; column < n_local; ++column)
            all.information(place[r], place[static_cast<std::size_t>(column)]) +=
                information(row, column);
    }
}

void add_bin(const Counts& counts,
             const Pixelisation& grid,
             const BinTerm& term,
             const Eigen::Ref<const Eigen::VectorXd>& parameters,
             Derivatives& all) {
    const SurveyCounts& survey = counts.surveys[term.survey];
    const BinCounts& bin = survey.bins[term.bin];
    const Footprint& footprint = survey.footprints[bin.footprint];
    const LocalSums sums = sums_of(bin, footprint, grid, point_of(term, parameters));
    const double monopole = parameters[term.monopole];
    const double scale = std::isnan(monopole) ? static_cast<double>(bin.total()) / sums.exposed
                                              : monopole * grid.solid_angle();
    add(term,
        (sums.counted_gradient - scale * sums.exposed_gradient) / term.dispersion,
        scale / term.dispersion * sums.exposed_square,
        all);
}

}  // namespace

Derivatives derivatives(const Counts& counts,
                        const ParameterSpace& space,
                        const Eigen::Ref<const Eigen::VectorXd>& parameters,
                        int only_survey) {
    const Pixelisation grid(counts.nside);
    const Eigen::Index n = space.n_parameters();
    Derivatives all{Eigen::VectorXd::Zero(n), Eigen::MatrixXd::Zero(n, n)};
    for (const BinTerm& term : space.terms())
        if (only_survey < 0 || term.survey == static_cast<std::size_t>(only_survey))
            add_bin(counts, grid, term, parameters, all);
    return all;
}

Eigen::MatrixXd expected_information(const Counts& counts,
                                     const ParameterSpace& space,
                                     const Eigen::Ref<const Eigen::VectorXd>& parameters,
                                     int only_survey) {
    return derivatives(counts, space, parameters, only_survey).information;
}

Eigen::MatrixXd bin_information(const Counts& counts,
                                const BinTerm& term,
                                Eigen::Index n_parameters,
                                const Eigen::Ref<const Eigen::VectorXd>& parameters) {
    Derivatives all{Eigen::VectorXd::Zero(n_parameters),
                    Eigen::MatrixXd::Zero(n_parameters, n_parameters)};
    add_bin(counts, Pixelisation(counts.nside), term, parameters, all);
    return all.information;
}

Eigen::MatrixXd eliminate(const Eigen::MatrixXd& information,
                          const std::vector<Eigen::Index>& keep,
                          const std::vector<Eigen::Index>& eliminate) {
    const Eigen::MatrixXd kept = information(keep, keep);
    if (eliminate.empty() || keep.empty()) return kept;
    const Eigen::MatrixXd block = information(eliminate, eliminate);
    // In units of each parameter's own error, so that unlike sizes do not look singular.
    const Eigen::VectorXd scale =
        block.diagonal().unaryExpr([](double x) { return x > 0.0 ? 1.0 / std::sqrt(x) : 0.0; });
    const Eigen::SelfAdjointEigenSolver<Eigen::MatrixXd> solver(
        Eigen::MatrixXd(scale.asDiagonal() * block * scale.asDiagonal()));
    const double least = 1e-12 * solver.eigenvalues().cwiseAbs().maxCoeff();
    const Eigen::VectorXd inverse =
        solver.eigenvalues().unaryExpr([least](double x) { return x > least ? 1.0 / x : 0.0; });
    const Eigen::MatrixXd across = solver.eigenvectors().transpose() * scale.asDiagonal() *
                                   Eigen::MatrixXd(information(eliminate, keep));
    const Eigen::MatrixXd result = kept - across.transpose() * inverse.asDiagonal() * across;
    return 0.5 * (result + result.transpose());
}

}  // namespace deviascope
