// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/model/moment_engine.h"

#include <algorithm>
#include <numeric>
#include <vector>

#include "deviascope/counts/moments.h"
#include "model/lorentz.h"
#include "model/moment_bound.h"
#include "model/moment_expansion.h"
#include "model/moment_group.h"
#include "model/moment_lanes.h"

namespace deviascope {
namespace {

using Rows = Eigen::Ref<const Eigen::MatrixXd>;
using Degrees = MomentEngine::Degrees;

std::vector<MomentGroup> groups_of(const Counts& counts, const ParameterSpace& space) {
    if (has_moments(counts)) return make_moment_groups(counts, space);
    Counts completed = counts;
    add_moments(completed);
    return make_moment_groups(completed, space);
}

/// Walkers of like degree side by side: a lane costs what the highest degree of its block
/// costs.
std::vector<std::size_t> by_degree(std::span<const Degrees> degrees) {
    std::vector<std::size_t> order(degrees.size());
    std::iota(order.begin(), order.end(), 0U);
    std::sort(order.begin(), order.end(), [&](std::size_t a, std::size_t b) {
        const Degrees &one = degrees[a], &other = degrees[b];
        if (one.intrinsic != other.intrinsic) return one.intrinsic < other.intrinsic;
        if (one.velocity != other.velocity) return one.velocity < other.velocity;
        return a < b;
    });
    return order;
}

/// A block of walkers; lanes without a walker repeat the first.
class LaneBlock {
  public:
    LaneBlock(const std::vector<MomentGroup>& groups, std::size_t n_terms) : groups_(groups) {
        walkers_.receding.resize(groups.size());
        walkers_.weight.resize(n_terms);
        sums_.balance.resize(n_terms);
        sums_.log_excess.resize(n_terms);
    }

    void clear() {
        walkers_.velocity.highest = 0;
        for (LaneSeries& series : walkers_.receding) series.highest = 0;
    }
    const LaneSums& evaluate() {
        sum_lanes(groups_, walkers_, sums_);
        return sums_;
    }

    void load(std::size_t lane, const Rows::ConstColXpr& row, const Degrees& degrees) {
        walkers_.velocity.set_degree(lane, degrees.velocity);
        for (std::size_t axis = 0; axis < 3; ++axis)
            walkers_.velocity.vector[axis].set(lane, row[static_cast<Eigen::Index>(axis)]);
        for (std::size_t group = 0; group < groups_.size(); ++group) {
            LaneSeries& series = walkers_.receding[group];
            series.set_degree(lane, degrees.intrinsic);
            for (std::size_t axis = 0; axis < 3; ++axis)
                series.vector[axis].set(
                    lane,
                    -groups_[group].bias_ratio *
                        row[groups_[group].intrinsic + static_cast<Eigen::Index>(axis)]);
            for (const MomentBin& bin : groups_[group].bins)
                walkers_.weight[bin.term].set(lane, row[bin.weight]);
        }
    }

  private:
    const std::vector<MomentGroup>& groups_;
    LaneWalkers walkers_;
    LaneSums sums_;
};

}  // namespace

struct MomentEngine::Tables {
    Tables(const Counts& counts, const ParameterSpace& space, double tolerance)
        : groups(groups_of(counts, space)),
          bound(counts, space, tolerance),
          places(space.terms().size()),
          weights(space.terms().size()) {
        for (std::size_t group = 0; group < groups.size(); ++group)
            for (std::size_t bin = 0; bin < groups[group].bins.size(); ++bin) {
                const MomentBin& one = groups[group].bins[bin];
                places[one.term] = {group, bin};
                weights[one.term] = one.weight;
            }
    }
    struct Place {
        std::size_t group = 0, bin = 0;
    };
    /// Copies one lane out.
    void unload(const LaneSums& sums,
                std::size_t lane,
                const Rows::ConstColXpr& row,
                Eigen::Ref<Eigen::VectorXd> balance,
                Eigen::Ref<Eigen::VectorXd> log_expected) const {
        const double log_gamma = log_lorentz_factor(row.head<3>());
        for (std::size_t t = 0; t < weights.size(); ++t) {
            const auto term = static_cast<Eigen::Index>(t);
            balance[term] = sums.balance[t].at(lane);
            log_expected[term] = sums.log_excess[t].at(lane) - row[weights[t]] * log_gamma;
        }
    }

    std::vector<MomentGroup> groups;
    MomentBound bound;
    std::vector<Place> places;          ///< of each term
    std::vector<Eigen::Index> weights;  ///< of each term
};

MomentEngine::MomentEngine(const Counts& counts, const ParameterSpace& space, double tolerance)
    : tables_(std::make_unique<const Tables>(counts, space, tolerance)) {}
MomentEngine::~MomentEngine() = default;
MomentEngine::MomentEngine(MomentEngine&&) noexcept = default;

Degrees MomentEngine::degrees_for(const Eigen::Ref<const Eigen::VectorXd>& row) const {
    return tables_->bound.degrees_for(row);
}

void MomentEngine::sums(const Eigen::Ref<const Eigen::MatrixXd>& parameters,
                        std::span<const Eigen::Index> walkers,
                        std::span<const Degrees> degrees,
                        Eigen::Ref<Eigen::MatrixXd> balance,
                        Eigen::Ref<Eigen::MatrixXd> log_expected) const {
    const std::vector<std::size_t> order = by_degree(degrees);
    LaneBlock block(tables_->groups, tables_->weights.size());
    for (std::size_t first = 0; first < order.size(); first += n_lanes) {
        const std::size_t n_used = std::min(n_lanes, order.size() - first);
        block.clear();
        for (std::size_t lane = 0; lane < n_lanes; ++lane) {
            const std::size_t at = order[first + (lane < n_used ? lane : 0)];
            block.load(lane, parameters.col(walkers[at]), degrees[at]);
        }
        const LaneSums& sums = block.evaluate();
        for (std::size_t lane = 0; lane < n_used; ++lane) {
            const Eigen::Index walker = walkers[order[first + lane]];
            tables_->unload(sums,
                            lane,
                            parameters.col(walker),
                            balance.col(walker),
                            log_expected.col(walker));
        }
    }
}

BinExpansion MomentEngine::expansion(std::size_t term,
                                     const Eigen::Ref<const Eigen::VectorXd>& row) const {
    const Tables::Place& place = tables_->places[term];
    return moment_expansion(tables_->groups[place.group], place.bin, row);
}

}  // namespace deviascope
