// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/model/information.h"

#include <Eigen/LU>
#include <catch2/catch.hpp>
#include <cmath>
#include <limits>

#include "exact_posterior.h"
#include "synthetic_counts.h"

using namespace deviascope;

namespace {

constexpr double at_maximum = std::numeric_limits<double>::quiet_NaN();

struct ConstantBin {
    std::uint32_t per_pixel;
    double weight;
};

/// The same count in every kept pixel.
struct ConstantSky {
    ConstantSky(const std::vector<std::vector<ConstantBin>>& surveys,
                const std::function<double(const Direction&)>& exposure,
                int nside = 64) {
        std::vector<synthetic::Survey> made;
        for (std::size_t s = 0; s < surveys.size(); ++s) {
            made.push_back({s == 0 ? "dunlin" : "lantern", {}});
            SurveyCounts survey;
            survey.name = made.back().name;
            survey.footprints.push_back(synthetic::make_footprint(nside, exposure));
            const std::size_t n = survey.footprints[0].pixel.size();
            for (const ConstantBin& bin : surveys[s]) {
                const std::string name = "bin" + std::to_string(survey.bins.size());
                made.back().bins.push_back({name, 0.0, bin.weight});
                survey.bins.push_back({name, 0, std::vector<std::uint32_t>(n, bin.per_pixel)});
            }
            counts.surveys.push_back(std::move(survey));
        }
        counts.nside = nside;
        options = synthetic::make_model(
            made, {"free", UniformVectorPrior{0.5}}, {"free", UniformVectorPrior{0.5}});
    }
    Eigen::VectorXd row(const ParameterSpace& space) const {
        Eigen::VectorXd made = Eigen::VectorXd::Zero(space.n_parameters());
        for (const BinTerm& term : space.terms()) {
            made[term.weight] =
                options.surveys[term.survey].weights.mean[static_cast<Eigen::Index>(term.bin)];
            made[term.monopole] = at_maximum;
        }
        return made;
    }
    Counts counts;
    ModelOptions options;
};

double everywhere(const Direction&) {
    return 1.0;
}

}  // namespace

TEST_CASE("shot noise of a dipole on a cut sky is that of the kept pixels", "[model]") {
    // <z^2> over pixel centres kept by |b| > 20 and 30 deg at nside 64: healpy 1.16.1.
    // Variances: Fisher information of lambda = n (1 + d.n), derived apart from this program.
    struct Cut {
        double lat_deg, kept, z_squared, analytic_z;
    };
    for (const Cut& cut : {Cut{20.0, 32512, 0.48437728, 2.0562058076},
                           Cut{30.0, 24832, 0.57986409, 1.7142857143}}) {
        const double limit = std::sin(cut.lat_deg * 3.14159265358979324 / 180.0) - 1e-12;
        const ConstantSky sky({{{10, 3.0}}}, [&](const Direction& n) {
            return std::abs(n.z()) >= limit ? 1.0 : 0.0;
        });
        REQUIRE(sky.counts.surveys[0].footprints[0].pixel.size() == std::size_t(cut.kept));
        const ParameterSpace space(sky.counts, sky.options);
        const Eigen::MatrixXd information =
            expected_information(sky.counts, space, sky.row(space));
        const Eigen::Matrix3d covariance = eliminate(information, {3, 4, 5}, {7}).inverse();
        const double sources = 10.0 * cut.kept;
        CHECK(sources * covariance(2, 2) == Approx(1.0 / cut.z_squared).epsilon(2e-8));
        CHECK(sources * covariance(0, 0) == Approx(2.0 / (1.0 - cut.z_squared)).epsilon(2e-8));
        CHECK(std::abs(covariance(0, 1)) < 1e-12 * covariance(0, 0));
        CHECK(information(7, 7) == Approx(sources));
        // Against the continuous sky: 3 / (1 + s + s^2), to the size of a pixel row.
        CHECK(sources * covariance(2, 2) == Approx(cut.analytic_z).epsilon(0.01));
    }
}

TEST_CASE("a one-sided cut ties the dipole to the monopole", "[model]") {
    // z > 0: N var(d_z) = 3 with the monopole known, 12 with the monopole eliminated (Fisher
    // information of the continuous cap, derived apart from this program).
    const ConstantSky sky({{{10, 3.0}}},
                          [](const Direction& n) { return n.z() > 1e-9 ? 1.0 : 0.0; });
    const ParameterSpace space(sky.counts, sky.options);
    const Eigen::MatrixXd information = expected_information(sky.counts, space, sky.row(space));
    const double sources = information(7, 7);
    CHECK(sources / eliminate(information, {5}, {})(0, 0) == Approx(3.0).epsilon(0.05));
    CHECK(sources / eliminate(information, {5}, {7})(0, 0) == Approx(12.0).epsilon(0.05));
}

TEST_CASE("bins of unlike weights separate velocity and intrinsic dipole", "[model]") {
    // Closed form on the full sky, var(beta) = 3 / (N sigma_K^2), derived apart from this
    // program; worked for N = (4, 3, 2, 1) 10^6, K = (2.5, 3.5, 4.5, 6). <z^2> of nside 64
    // differs from 1/3 by 2.3e-5 of itself.
    const std::vector<ConstantBin> first = {{80, 2.5}, {60, 3.5}, {40, 4.5}, {20, 6.0}};
    const std::vector<ConstantBin> second = {{100, 2.2}, {100, 3.0}};
    const ConstantSky sky({first, second}, everywhere);
    const ParameterSpace space(sky.counts, sky.options);
    const Eigen::VectorXd row = sky.row(space);
    const double scale = std::sqrt(200.0 * 49152.0 / 1e7);  // to 10^7 sources in the first
    const std::vector<Eigen::Index> monopoles = {15, 16, 17, 18, 19, 20};
    const Eigen::MatrixXd alone = expected_information(sky.counts, space, row, 0);
    const Eigen::MatrixXd covariance =
        eliminate(alone, {0, 1, 2, 3, 4, 5}, monopoles).inverse();
    CHECK(scale * std::sqrt(covariance(2, 2)) == Approx(4.9537740462e-04).epsilon(3e-5));
    CHECK(scale * std::sqrt(covariance(5, 5)) == Approx(1.8419115171e-03).epsilon(3e-5));
    CHECK(covariance(2, 5) / std::sqrt(covariance(2, 2) * covariance(5, 5)) ==
          Approx(-0.9547634455).epsilon(1e-9));
    const Eigen::MatrixXd no_intrinsic = eliminate(alone, {0, 1, 2}, monopoles).inverse();
    CHECK(scale * std::sqrt(no_intrinsic(0, 0)) == Approx(1.4730858484e-04).epsilon(3e-5));
    std::vector<Eigen::Index> rest = {3, 4, 5, 6, 7, 8};
    rest.insert(rest.end(), monopoles.begin(), monopoles.end());
    const Eigen::MatrixXd joint =
        eliminate(expected_information(sky.counts, space, row), {0, 1, 2}, rest).inverse();
    CHECK(scale * std::sqrt(joint(1, 1)) == Approx(4.6583064700e-04).epsilon(3e-5));
}

TEST_CASE("equal weights leave no information on the velocity", "[model]") {
    const ConstantSky sky({{{30, 3.0}, {50, 3.0}}}, everywhere, 16);
    const ParameterSpace space(sky.counts, sky.options);
    const Eigen::MatrixXd information = expected_information(sky.counts, space, sky.row(space));
    const Eigen::MatrixXd left = eliminate(information, {0, 1, 2}, {3, 4, 5, 8, 9});
    CHECK(left.cwiseAbs().maxCoeff() < 1e-10 * information(0, 0));
}

TEST_CASE("the score is the slope of an 80-bit log-likelihood", "[model]") {
    std::vector<synthetic::Survey> surveys = {
        {"dunlin", {{"faint", 3000, 2.5, 0.1}, {"bright", 2000, 6.0, 0.1, 1.4, 1.7}}}};
    const Counts counts = synthetic::make_counts(4, {0, 0, 0.01}, surveys, 81);
    const ModelOptions options = synthetic::make_model(
        surveys, {"free", UniformVectorPrior{0.5}}, {"free", UniformVectorPrior{0.5}});
    const ParameterSpace space(counts, options);
    Eigen::VectorXd row(space.n_parameters());
    row << 0.1, -0.2, 0.05, 0.2, 0.1, -0.3, 2.4, 6.3, at_maximum, at_maximum;
    const Derivatives at = derivatives(counts, space, row);
    for (Eigen::Index k = 0; k < 8; ++k) {
        const double step = 1e-5;
        Eigen::VectorXd ahead = row, behind = row;
        ahead[k] += step;
        behind[k] -= step;
        // With a = b = 0 the integrated form is the profile over the monopoles.
        const double slope = static_cast<double>(exact::log_likelihood(counts, space, ahead) -
                                                 exact::log_likelihood(counts, space, behind)) /
                             (ahead[k] - behind[k]);
        INFO("parameter " << k);
        CHECK(at.score[k] == Approx(slope).epsilon(1e-6).margin(1e-4));
    }
    CHECK(std::abs(at.score[8]) < 1e-8);
    CHECK(at.information(8, 9) == 0.0);
}

TEST_CASE("elimination is the block of the inverse, and leaves out what is undetermined",
          "[model]") {
    Eigen::Matrix4d information;
    information << 10, 2, 1, 0, 2, 8, 3, 0, 1, 3, 6, 0, 0, 0, 0, 0;
    const Eigen::MatrixXd full = Eigen::Matrix3d(information.topLeftCorner(3, 3)).inverse();
    const Eigen::MatrixXd kept = eliminate(information, {1, 0}, {2, 3});
    const Eigen::MatrixXd expected =
        Eigen::MatrixXd(full(std::vector<int>{1, 0}, std::vector<int>{1, 0})).inverse();
    CHECK((kept - expected).cwiseAbs().maxCoeff() < 1e-13);
}
