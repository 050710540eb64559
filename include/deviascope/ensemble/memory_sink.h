// SPDX-License-Identifier: GPL-2.0-or-later
// model -> ENSEMBLE -> chain
#pragma once

#include <vector>

#include "deviascope/ensemble/draws.h"

namespace deviascope {

/// Keeps a whole run in memory: for runs that are looked at and not stored.
class MemorySink : public DrawSink {
  public:
    void warm_up(const WarmUp& warm_up) override {
        kept_warm_up = warm_up;
        ++n_warm_ups;
    }
    void block(const Draws& rows, const EnsembleState& state) override {
        draws.n_replicates = rows.n_replicates;
        draws.n_walkers = rows.n_walkers;
        draws.n_parameters = rows.n_parameters;
        draws.n_rows += rows.n_rows;
        append(draws.value, rows.value);
        append(draws.log_posterior, rows.log_posterior);
        append(draws.log_likelihood, rows.log_likelihood);
        block_rows.push_back(rows.n_rows);
        states.push_back(state);
    }

    WarmUp kept_warm_up;
    int n_warm_ups = 0;
    Draws draws;
    std::vector<Eigen::Index> block_rows;
    std::vector<EnsembleState> states;

  private:
    template <class Array>
    static void append(Array& to, const Array& from) {
        to.insert(to.end(), from.begin(), from.end());
    }
};

}  // namespace deviascope
