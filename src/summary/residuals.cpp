// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/summary/residuals.h"

#include <cmath>
#include <limits>

#include "deviascope/core/error.h"
#include "deviascope/model/expected_counts.h"
#include "deviascope/summary/draw_values.h"

namespace deviascope {
namespace {

void weigh_residuals(ResidualMap& map, const std::vector<double>& variance) {
    map.residual.assign(variance.size(), std::numeric_limits<double>::quiet_NaN());
    for (std::size_t cell = 0; cell < variance.size(); ++cell) {
        if (!(variance[cell] > 0.0)) continue;
        const double residual =
            (map.counted[cell] - map.expected[cell]) / std::sqrt(variance[cell]);
        map.residual[cell] = residual;
        map.chi_squared += residual * residual;
        ++map.n_cells;
        if (std::abs(residual) > std::abs(map.largest)) map.largest = residual;
    }
}

}  // namespace

ResidualMap residual_map(const Chain& chain,
                         const ParameterSpace& space,
                         std::size_t survey,
                         int nside) {
    ensure(nside <= chain.counts.nside, "residuals are not finer than the counts");
    const Pixelisation fine(chain.counts.nside), coarse(nside);
    const auto n_cells = static_cast<std::size_t>(coarse.n_pixels());
    ResidualMap map{nside, std::vector<double>(n_cells), std::vector<double>(n_cells), {}};
    std::vector<double> variance(n_cells);
    const Eigen::VectorXd mean = mean_row(chain.draws);
    for (const BinTerm& term : space.terms()) {
        if (term.survey != survey) continue;
        const BinCounts& bin = chain.counts.surveys[survey].bins[term.bin];
        const Footprint& footprint = chain.counts.surveys[survey].footprints[bin.footprint];
        const std::vector<double> expected = expected_counts(chain.counts, term, mean);
        for (std::size_t place = 0; place < footprint.pixel.size(); ++place) {
            const auto cell =
                static_cast<std::size_t>(fine.parent(footprint.pixel[place], coarse));
            map.counted[cell] += bin.count[place];
            map.expected[cell] += expected[place];
            variance[cell] += term.dispersion * expected[place];
        }
    }
    weigh_residuals(map, variance);
    return map;
}

}  // namespace deviascope
