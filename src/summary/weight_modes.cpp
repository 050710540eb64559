// SPDX-License-Identifier: GPL-2.0-or-later
#include "summary/weight_modes.h"

#include <cmath>

namespace deviascope {

namespace {

/// Coefficients of the linear forms f and c in the weights.
struct Forms {
    Eigen::VectorXd factor, shift;
};

Forms forms_of(const Eigen::VectorXd& n, const Eigen::VectorXd& mean) {
    const double total = n.sum();
    const double centre = n.dot(mean) / total;
    const Eigen::VectorXd apart = mean.array() - centre;
    const double spread = n.dot(apart.cwiseAbs2());
    constexpr double equal = 1e-12;  // relative variance of the weights
    if (spread <= equal * n.dot(mean.cwiseAbs2())) {
        const Eigen::VectorXd along = n.cwiseProduct(mean);
        return {along / along.dot(mean), Eigen::VectorXd::Zero(n.size())};
    }
    const Eigen::VectorXd factor = n.cwiseProduct(apart) / spread;
    return {factor, n / total - centre * factor};
}

WeightMode mode_of(const Eigen::VectorXd& form,
                   const WeightPrior& prior,
                   const Eigen::MatrixXd& draws) {
    const Eigen::VectorXd value = draws * form;
    WeightMode mode;
    mode.mean = value.mean();
    mode.sd = std::sqrt((value.array() - mode.mean).square().sum() /
                        static_cast<double>(value.size() - 1));
    mode.prior_sd = std::sqrt(std::max(form.dot(prior.covariance * form), 0.0));
    return mode;
}

}  // namespace

WeightModes weight_modes(const Eigen::VectorXd& n,
                         const WeightPrior& prior,
                         const Eigen::MatrixXd& draws) {
    const Forms forms = forms_of(n, prior.mean);
    return {mode_of(forms.factor, prior, draws), mode_of(forms.shift, prior, draws)};
}

}  // namespace deviascope
