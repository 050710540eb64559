// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/model/expected_counts.h"

#include <cmath>

#include "deviascope/sky/pixelisation.h"
#include "model/lorentz.h"

namespace deviascope {
namespace {

/// What velocity and intrinsic dipole make of one source per unit of sky.
class Modulation {
  public:
    Modulation(const BinTerm& term, const Eigen::Ref<const Eigen::VectorXd>& parameters)
        : velocity_(parameters.head<3>()),
          dipole_(term.bias_ratio * parameters.segment<3>(term.intrinsic)),
          weight_(parameters[term.weight]),
          log_gamma_(log_lorentz_factor(velocity_)) {}

    double in(const Direction& n) const {
        const double log_delta = -log_gamma_ - std::log1p(-velocity_.dot(n));
        return std::exp(weight_ * log_delta) * (1.0 + dipole_.dot(n));
    }

  private:
    Eigen::Vector3d velocity_, dipole_;
    double weight_, log_gamma_;
};

}  // namespace

std::vector<double> expected_counts(const Counts& counts,
                                    const BinTerm& term,
                                    const Eigen::Ref<const Eigen::VectorXd>& parameters) {
    const SurveyCounts& survey = counts.surveys[term.survey];
    const BinCounts& bin = survey.bins[term.bin];
    const Footprint& footprint = survey.footprints[bin.footprint];
    const Pixelisation grid(counts.nside);
    const Modulation modulation(term, parameters);
    std::vector<double> expected(footprint.pixel.size());
    double sum = 0.0;
    for (std::size_t p = 0; p < expected.size(); ++p) {
        expected[p] = footprint.exposure[p] * modulation.in(grid.centre(footprint.pixel[p]));
        sum += expected[p];
    }
    const double monopole = parameters[term.monopole];
    const double scale = std::isnan(monopole) ? static_cast<double>(bin.total()) / sum
                                              : monopole * grid.solid_angle();
    for (double& value : expected) value *= scale;
    return expected;
}

double expected_density(const BinTerm& term,
                        const Eigen::Ref<const Eigen::VectorXd>& parameters,
                        const Direction& direction) {
    return parameters[term.monopole] * Modulation(term, parameters).in(direction);
}

}  // namespace deviascope
