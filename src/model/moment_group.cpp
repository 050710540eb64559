// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/moment_group.h"

#include <algorithm>

#include "counts/monomials.h"
#include "deviascope/core/error.h"
#include "deviascope/counts/moments.h"

namespace deviascope {
namespace {

void fill_exposure(const Footprint& footprint, MomentGroup& group) {
    const std::vector<Exponents> monomials = monomial_exponents(moment_degree);
    group.exposure.resize(4 * monomials.size());
    for (std::size_t m = 0; m < monomials.size(); ++m) {
        const double factor = multinomial(monomials[m]);
        group.exposure[4 * m] = factor * footprint.moment[m];
        for (std::size_t axis = 0; axis < 3; ++axis) {
            Exponents raised = monomials[m];
            ++raised[axis];
            group.exposure[4 * m + 1 + axis] =
                factor * footprint.moment[monomial_index(raised)];
        }
    }
}

void fill_excess(const std::vector<const BinCounts*>& bins, MomentGroup& group) {
    const std::vector<Exponents> monomials = monomial_exponents(moment_degree);
    group.excess.assign(monomials.size() * group.n_padded, 0.0);
    for (std::size_t m = 1; m < monomials.size(); ++m) {
        const Exponents& powers = monomials[m];
        const double factor = multinomial(powers) / (powers[0] + powers[1] + powers[2]);
        for (std::size_t bin = 0; bin < bins.size(); ++bin)
            group.excess[m * group.n_padded + bin] = factor * bins[bin]->excess_moment[m];
    }
}

/// A group being collected.
struct Draft {
    const Footprint* footprint = nullptr;
    MomentGroup group;
    std::vector<const BinCounts*> bins;

    bool takes(const Footprint* other, const BinTerm& term) const {
        return footprint == other && group.intrinsic == term.intrinsic &&
               group.bias_ratio == term.bias_ratio;
    }
};

std::vector<Draft> sorted_terms(const Counts& counts, const ParameterSpace& space) {
    std::vector<Draft> drafts;
    for (std::size_t t = 0; t < space.terms().size(); ++t) {
        const BinTerm& term = space.terms()[t];
        const SurveyCounts& survey = counts.surveys[term.survey];
        const BinCounts& bin = survey.bins[term.bin];
        const Footprint* footprint = &survey.footprints[bin.footprint];
        auto draft = std::find_if(drafts.begin(), drafts.end(), [&](const Draft& one) {
            return one.takes(footprint, term);
        });
        if (draft == drafts.end()) {
            drafts.push_back({footprint, {}, {}});
            draft = std::prev(drafts.end());
            draft->group.intrinsic = term.intrinsic;
            draft->group.bias_ratio = term.bias_ratio;
        }
        draft->group.bins.push_back({t, term.weight, static_cast<double>(bin.total())});
        draft->bins.push_back(&bin);
    }
    return drafts;
}

}  // namespace

std::vector<MomentGroup> make_moment_groups(const Counts& counts, const ParameterSpace& space) {
    ensure(has_moments(counts), "counts have their moments");
    std::vector<MomentGroup> groups;
    for (Draft& draft : sorted_terms(counts, space)) {
        MomentGroup& group = draft.group;
        group.n_padded = (group.bins.size() + bins_per_chunk - 1) / bins_per_chunk;
        group.n_padded *= bins_per_chunk;
        fill_exposure(*draft.footprint, group);
        fill_excess(draft.bins, group);
        groups.push_back(std::move(group));
    }
    return groups;
}

}  // namespace deviascope
