// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/engines.h"

#include <vector>

namespace deviascope {
namespace {

Eigen::VectorXd sources_of(const Counts& counts, const ParameterSpace& space) {
    Eigen::VectorXd sources(std::ssize(space.terms()));
    for (std::size_t t = 0; t < space.terms().size(); ++t) {
        const BinTerm& term = space.terms()[t];
        sources[static_cast<Eigen::Index>(t)] =
            static_cast<double>(counts.surveys[term.survey].bins[term.bin].total());
    }
    return sources;
}

/// The columns of a matrix, or the matrix itself where it is all of them.
Eigen::MatrixXd chosen(const Eigen::Ref<const Eigen::MatrixXd>& rows,
                       std::span<const Eigen::Index> columns) {
    Eigen::MatrixXd some(rows.rows(), std::ssize(columns));
    for (Eigen::Index at = 0; at < some.cols(); ++at)
        some.col(at) = rows.col(columns[static_cast<std::size_t>(at)]);
    return some;
}

}  // namespace

Engines::Engines(const Counts& counts, const ParameterSpace& space)
    : space_(space), sources_(sources_of(counts, space)), pixel_(counts, space) {
    const EngineOptions& options = space.options().engine;
    if (options.engine != Engine::pixel) moment_.emplace(counts, space, options.tolerance);
}

Engines::Sums Engines::sums(const Eigen::Ref<const Eigen::MatrixXd>& rows) const {
    const Eigen::Index n_terms = std::ssize(space_.terms());
    Sums all{Eigen::MatrixXd(n_terms, rows.cols()), Eigen::MatrixXd(n_terms, rows.cols()), 0};
    std::vector<MomentEngine::Degrees> degrees;
    std::vector<Eigen::Index> by_moments, by_pixels;
    for (Eigen::Index column = 0; column < rows.cols(); ++column) {
        const MomentEngine::Degrees enough =
            moment_ ? moment_->degrees_for(rows.col(column)) : MomentEngine::Degrees{};
        if (enough.are_enough()) {
            by_moments.push_back(column);
            degrees.push_back(enough);
        } else {
            by_pixels.push_back(column);
        }
    }
    all.by_moments = std::ssize(by_moments);
    if (!by_moments.empty())
        moment_->sums(rows, by_moments, degrees, all.balance, all.log_expected);
    if (!by_pixels.empty()) add_pixel_sums(rows, by_pixels, all);
    return all;
}

void Engines::add_pixel_sums(const Eigen::Ref<const Eigen::MatrixXd>& rows,
                             std::span<const Eigen::Index> columns,
                             Sums& sums) const {
    Eigen::MatrixXd counted(sums.balance.rows(), std::ssize(columns));
    Eigen::MatrixXd log_expected(sums.balance.rows(), std::ssize(columns));
    pixel_.sums(chosen(rows, columns), counted, log_expected);
    for (Eigen::Index at = 0; at < std::ssize(columns); ++at) {
        const Eigen::Index column = columns[static_cast<std::size_t>(at)];
        for (Eigen::Index term = 0; term < counted.rows(); ++term) {
            sums.balance(term, column) =
                counted(term, at) - sources_[term] * log_expected(term, at);
            sums.log_expected(term, column) = log_expected(term, at);
        }
    }
}

double log_likelihood(const ParameterSpace& space,
                      const std::vector<BinTotals>& totals,
                      const Eigen::Ref<const Eigen::MatrixXd>& rows,
                      const Engines::Sums& sums,
                      Eigen::Index walker) {
    double sum = 0.0;
    for (std::size_t t = 0; t < totals.size(); ++t) {
        const auto term = static_cast<Eigen::Index>(t);
        sum += log_likelihood_of(totals[t],
                                 space.options().monopole,
                                 rows(space.terms()[t].monopole, walker),
                                 sums.balance(term, walker),
                                 sums.log_expected(term, walker));
    }
    return sum;
}

BinExpansion Engines::expansion(const Counts& counts,
                                std::size_t term,
                                const Eigen::Ref<const Eigen::VectorXd>& row) const {
    if (moment_ && moment_->degrees_for(row).are_enough()) return moment_->expansion(term, row);
    return pixel_expansion(counts, space_.terms()[term], row);
}

}  // namespace deviascope
