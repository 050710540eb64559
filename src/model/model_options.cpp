// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/model/model_options.h"

#include <fmt/format.h>

#include <Eigen/Cholesky>
#include <cmath>

#include "deviascope/counts/count_map.h"

namespace deviascope {
namespace {

/// A fixed intrinsic vector that no bin with this bias ratio can feel.
bool is_beyond_wall(const VectorPrior& intrinsic, double bias_ratio) {
    const auto* fixed = std::get_if<FixedPrior>(&intrinsic.kind());
    return fixed != nullptr && (bias_ratio * fixed->value).squaredNorm() >= 1.0;
}

std::vector<Message> problems_of_bins(const SurveyModel& model,
                                      const VectorPrior& intrinsic,
                                      const SurveyCounts& survey) {
    std::vector<Message> problems;
    for (std::size_t b = 0; b < model.bins.size(); ++b) {
        const BinModel& bin = model.bins[b];
        const std::string place = survey.name + "/" + survey.bins[b].name;
        if (!std::isfinite(bin.bias_ratio))
            problems.push_back({place,
                                fmt::format("bias = {}", bin.bias_ratio),
                                "a finite number is allowed",
                                ""});
        if (is_beyond_wall(intrinsic, bin.bias_ratio))
            problems.push_back({place,
                                fmt::format("bias = {}", bin.bias_ratio),
                                "bias times the fixed intrinsic dipole must be shorter than 1",
                                ""});
        if (!(bin.dispersion > 0.0) || !std::isfinite(bin.dispersion))
            problems.push_back({place,
                                fmt::format("dispersion = {}", bin.dispersion),
                                "a number above 0 is allowed",
                                ""});
    }
    return problems;
}

/// The block of a symmetric matrix that belongs to some of its rows.
Eigen::MatrixXd block_of(const Eigen::MatrixXd& matrix, const std::vector<Eigen::Index>& rows) {
    return matrix(rows, rows);
}

std::vector<Message> problems_of_weights(const WeightPrior& prior, const SurveyCounts& survey) {
    const std::string place = survey.name + ": weights";
    const Eigen::Index n = std::ssize(survey.bins);
    if (prior.mean.size() != n || prior.covariance.rows() != n || prior.covariance.cols() != n)
        return {{place,
                 fmt::format("{} means and a covariance of {} x {}",
                             prior.mean.size(),
                             prior.covariance.rows(),
                             prior.covariance.cols()),
                 fmt::format("{} bins need as many", n),
                 ""}};
    const Eigen::MatrixXd& c = prior.covariance;
    if (!prior.mean.allFinite() || !c.allFinite())
        return {{place,
                 "a mean or covariance that is not finite",
                 "finite numbers are allowed",
                 ""}};
    const double scale = n > 0 ? c.cwiseAbs().maxCoeff() : 0.0;
    if (n > 0 && (c - c.transpose()).cwiseAbs().maxCoeff() > 1e-12 * scale)
        return {
            {place, "a covariance that is not symmetric", "a symmetric one is allowed", ""}};
    for (Eigen::Index b = 0; b < n; ++b)
        if (c(b, b) == 0.0 && !c.row(b).isZero(0.0))
            return {{place,
                     fmt::format("bin {} has variance 0 and a covariance with another bin",
                                 survey.bins[static_cast<std::size_t>(b)].name),
                     "a weight without variance has no covariance",
                     "give it a variance"}};
    const std::vector<Eigen::Index> sampled = prior.sampled();
    // Correlations, so that unlike sizes of the weights do not matter.
    Eigen::MatrixXd correlation = block_of(c, sampled);
    const Eigen::VectorXd sd = correlation.diagonal().cwiseMax(0.0).cwiseSqrt();
    correlation.array() /= (sd * sd.transpose()).array();
    const Eigen::LLT<Eigen::MatrixXd> factor(correlation);
    constexpr double least_pivot =
        1e-6;  // of a correlation matrix: one part in 10^12 of variance
    if (!sampled.empty() &&
        (!correlation.allFinite() || factor.info() != Eigen::Success ||
         Eigen::MatrixXd(factor.matrixL()).diagonal().minCoeff() < least_pivot))
        return {
            {place,
             "a covariance that is not positive definite",
             "every combination of the weights needs a width of its own",
             "add the independent error of each bin, or leave the weight out with variance 0"}};
    return {};
}

std::vector<Message> problems_of_monopole(const MonopolePrior& prior) {
    const auto is_allowed = [](double x) { return x >= 0.0 && std::isfinite(x); };
    if (is_allowed(prior.shape) && is_allowed(prior.rate)) return {};
    return {{"monopole",
             fmt::format("shape = {}, rate = {}", prior.shape, prior.rate),
             "finite numbers of 0 or more are allowed",
             ""}};
}

void append(std::vector<Message>& all, std::vector<Message> more) {
    all.insert(all.end(), more.begin(), more.end());
}

}  // namespace

std::vector<Eigen::Index> WeightPrior::sampled() const {
    std::vector<Eigen::Index> bins;
    for (Eigen::Index b = 0; b < covariance.rows(); ++b)
        if (covariance(b, b) != 0.0) bins.push_back(b);
    return bins;
}

std::vector<Message> problems_of(const ModelOptions& options, const Counts& counts) {
    std::vector<Message> problems = problems_of_monopole(options.monopole);
    if (options.surveys.size() != counts.surveys.size()) {
        problems.push_back({"model",
                            fmt::format("{} surveys", options.surveys.size()),
                            fmt::format("the counts have {}", counts.surveys.size()),
                            ""});
        return problems;
    }
    for (std::size_t s = 0; s < counts.surveys.size(); ++s) {
        const SurveyModel& model = options.surveys[s];
        const SurveyCounts& survey = counts.surveys[s];
        if (survey.name == "all")
            problems.push_back({"survey",
                                "the name \"all\"",
                                "it stands for the intrinsic vector that all share",
                                "choose another name"});
        if (model.bins.size() != survey.bins.size()) {
            problems.push_back({survey.name,
                                fmt::format("{} bins", model.bins.size()),
                                fmt::format("the counts have {}", survey.bins.size()),
                                ""});
            continue;
        }
        append(
            problems,
            problems_of_bins(
                model, options.intrinsic_shared ? options.intrinsic : model.intrinsic, survey));
        append(problems, problems_of_weights(model.weights, survey));
    }
    return problems;
}

}  // namespace deviascope
