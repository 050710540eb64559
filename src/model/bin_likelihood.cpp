// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/bin_likelihood.h"

#include <cmath>
#include <limits>

#include "deviascope/core/error.h"
#include "deviascope/sky/pixelisation.h"

namespace deviascope {

std::vector<BinTotals> totals_of(const Counts& counts, const ParameterSpace& space) {
    const Pixelisation grid(counts.nside);
    std::vector<BinTotals> totals;
    for (const BinTerm& term : space.terms()) {
        const SurveyCounts& survey = counts.surveys[term.survey];
        const BinCounts& bin = survey.bins[term.bin];
        const Footprint& footprint = survey.footprints[bin.footprint];
        const std::string place = survey.name + "/" + bin.name;
        if (footprint.pixel.empty())
            throw InputError({place,
                              "no pixel is kept",
                              "at least one is needed",
                              "exclude less, or leave the bin out"});
        if (bin.total() == 0 && space.options().monopole.shape == 0.0)
            throw InputError(
                {place,
                 "no sources",
                 "a bin needs one under a monopole prior of shape 0",
                 "leave the bin out, or give the monopole a prior of shape above 0"});
        totals.push_back({static_cast<double>(bin.total()) / term.dispersion,
                          footprint.exposed_solid_angle(grid) / term.dispersion,
                          term.dispersion});
    }
    return totals;
}

double integrated_log_likelihood(const BinTotals& bin,
                                 const MonopolePrior& prior,
                                 double balance,
                                 double log_expected) {
    const double divided = balance / bin.dispersion;
    if (prior.rate == 0.0)
        return prior.shape == 0.0 ? divided : divided - prior.shape * log_expected;
    const double log_ratio =
        std::log1p(bin.exposed / (bin.exposed + prior.rate) * std::expm1(log_expected));
    return divided + bin.sources * log_expected - (bin.sources + prior.shape) * log_ratio;
}

double sampled_log_likelihood(const BinTotals& bin,
                              double monopole,
                              double balance,
                              double log_expected) {
    if (!(monopole > 0.0) || std::isinf(monopole))
        return -std::numeric_limits<double>::infinity();
    if (bin.sources == 0.0) return -monopole * bin.exposed * std::exp(log_expected);
    const double t = std::log(monopole * bin.exposed / bin.sources) + log_expected;
    return balance / bin.dispersion + bin.sources * (t - std::expm1(t));
}

double log_likelihood_of(const BinTotals& bin,
                         const MonopolePrior& prior,
                         double monopole,
                         double balance,
                         double log_expected) {
    return prior.sampled ? sampled_log_likelihood(bin, monopole, balance, log_expected)
                         : integrated_log_likelihood(bin, prior, balance, log_expected);
}

}  // namespace deviascope
