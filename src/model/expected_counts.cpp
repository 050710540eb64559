// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/model/expected_counts.h"

#include <cmath>

#include "deviascope/sky/pixelisation.h"
#include "model/lorentz.h"

namespace deviascope {

std::vector<double> expected_counts(const Counts& counts,
                                    const BinTerm& term,
                                    const Eigen::Ref<const Eigen::VectorXd>& parameters) {
    const SurveyCounts& survey = counts.surveys[term.survey];
    const BinCounts& bin = survey.bins[term.bin];
    const Footprint& footprint = survey.footprints[bin.footprint];
    const Pixelisation grid(counts.nside);
    const Eigen::Vector3d velocity = parameters.head<3>();
    const Eigen::Vector3d dipole = term.bias_ratio * parameters.segment<3>(term.intrinsic);
    const double weight = parameters[term.weight];
    const double log_gamma = log_lorentz_factor(velocity);

    std::vector<double> expected(footprint.pixel.size());
    double sum = 0.0;
    for (std::size_t p = 0; p < expected.size(); ++p) {
        const Direction n = grid.centre(footprint.pixel[p]);
        const double log_delta = -log_gamma - std::log1p(-velocity.dot(n));
        expected[p] =
            footprint.exposure[p] * std::exp(weight * log_delta) * (1.0 + dipole.dot(n));
        sum += expected[p];
    }
    const double monopole = parameters[term.monopole];
    const double scale = std::isnan(monopole) ? static_cast<double>(bin.total()) / sum
                                              : monopole * grid.solid_angle();
    for (double& value : expected) value *= scale;
    return expected;
}

}  // namespace deviascope
