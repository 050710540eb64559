// SPDX-License-Identifier: GPL-2.0-or-later
#include <Eigen/Geometry>
#include <algorithm>
#include <catch2/catch.hpp>
#include <cmath>
#include <functional>
#include <numbers>

#include "deviascope/core/error.h"
#include "deviascope/core/physical_constants.h"
#include "deviascope/core/random.h"
#include "deviascope/summary/summary.h"
#include "even_counts.h"

using namespace deviascope;

namespace {

// Planck 2018 I (A&A 641, A1), Table 2: l, b = 264.021, 48.253 deg (+- 0.011, 0.005), v =
// 369.82
// +- 0.11 km/s. ICRS place by eraG2icrs of liberfa 2.0.0.
const double cmb_speed = 369.82 / 299792.458;
const Direction cmb_direction = direction_of(264.021, 48.253);
constexpr double cmb_ra = 167.9419082211, cmb_dec = -6.9442641383;

const std::vector<even::Survey> surveys{
    {"dunlin", {{"faint", 2000, 2.5, 0.05}, {"bright", 1000, 4.5}}}};
const VectorPrior free_velocity("free-velocity", UniformVectorPrior{0.05});
const VectorPrior wide_dipole("gaussian",
                              GaussianPrior{Eigen::Vector3d::Zero(),
                                            1e-2 * Eigen::Matrix3d::Identity()});

/// Fills one row of parameters; numbers of the draw and a stream of its own are given.
using Fill = std::function<void(Stream&, Eigen::Ref<Eigen::VectorXd>)>;

struct Run {
    Counts counts = even::counts_of(8, surveys);
    ParameterSpace space;
    Chain chain;
    SummaryOptions options;

    explicit Run(const Fill& fill,
                 const VectorPrior& velocity = free_velocity,
                 const VectorPrior& intrinsic = wide_dipole)
        : space(counts, even::make_model(surveys, velocity, intrinsic)) {
        options.title = "example";
        options.cmb_velocity = cmb_speed * cmb_direction;
        chain.counts = counts;
        chain.parameters = space.parameters();
        chain.vectors = space.vectors();
        chain.outcome = {Outcome::End::converged, 1000, 200, 10, 50, true, {}};
        chain.outcome.tally.tried = {600, 400, 0};
        chain.outcome.tally.taken = {200, 100, 0};
        chain.state.evaluations = {{"moment", 990}, {"pixel", 10}};
        add_draws(fill);
    }

    Summary summary() const { return summarise(chain, space, options); }

  private:
    void add_draws(const Fill& fill) {
        Draws& draws = chain.draws;
        draws.n_rows = 50;
        draws.n_replicates = 2;
        draws.n_walkers = 60;
        draws.n_parameters = space.n_parameters();
        const auto n = static_cast<std::size_t>(50 * 2 * 60);
        draws.log_posterior.resize(n);
        draws.log_likelihood.resize(n);
        for (std::size_t draw = 0; draw < n; ++draw) {
            Stream stream(20260817, Purpose::test, 600, draw, 0);
            Eigen::VectorXd row = Eigen::VectorXd::Zero(draws.n_parameters);
            row[6] = 2.5 + 0.05 * normal(stream);  // weight.dunlin.faint
            row[7] = 4.5;                          // weight.dunlin.bright: constant
            row[8] = 122231.0 + 160.0 * normal(stream);
            row[9] = 61115.0 + 110.0 * normal(stream);
            fill(stream, row);
            draws.value.insert(draws.value.end(), row.begin(), row.end());
        }
    }
};

void add_normal(Stream& stream, double sd, Eigen::Ref<Eigen::VectorXd> vector) {
    for (Eigen::Index axis = 0; axis < 3; ++axis) vector[axis] += sd * normal(stream);
}

/// A detected velocity and a detected intrinsic dipole.
void ordinary(Stream& stream, Eigen::Ref<Eigen::VectorXd> row) {
    row.head<3>() = cmb_speed * cmb_direction;
    add_normal(stream, 2e-4, row.head<3>());
    row.segment<3>(3) << 4e-3, 0.0, -3e-3;
    add_normal(stream, 5e-4, row.segment<3>(3));
}

std::vector<double> sorted_lengths(const Chain& chain, std::size_t first) {
    std::vector<double> lengths;
    const auto n = static_cast<std::size_t>(chain.draws.n_parameters);
    for (std::size_t at = first; at < chain.draws.value.size(); at += n)
        lengths.push_back(std::hypot(
            chain.draws.value[at], chain.draws.value[at + 1], chain.draws.value[at + 2]));
    std::sort(lengths.begin(), lengths.end());
    return lengths;
}

bool warns(const Summary& summary, const std::string& words) {
    return std::any_of(summary.warnings.begin(), summary.warnings.end(), [&](const auto& text) {
        return text.find(words) != std::string::npos;
    });
}

}  // namespace

TEST_CASE("a summary against its definitions", "[summary]") {
    Run run(ordinary);
    run.chain.warm_up.warnings = {"The counts do not hold velocity.x."};
    const Summary summary = run.summary();
    CHECK(summary.job == "example");
    const auto speed = sorted_lengths(run.chain, 0);
    CHECK(summary.velocity.amplitude.median ==
          Approx(0.5 * (speed[2999] + speed[3000])).epsilon(1e-14));
    CHECK(summary.velocity.prior == "free-velocity");
    CHECK(summary.velocity.prior_median_amplitude == Approx(0.05 / std::cbrt(2.0)));
    REQUIRE(summary.intrinsic.size() == 1);
    CHECK(summary.intrinsic[0].name == "dunlin");
    CHECK(summary.intrinsic[0].amplitude.interval95[0] > 3e-3);

    // Means and covariance of 6,000 draws within five of their standard errors.
    CHECK((summary.velocity.mean - cmb_speed * cmb_direction).norm() < 5 * 2e-4 / 77.0 * 1.7);
    for (int axis = 0; axis < 3; ++axis)
        CHECK(summary.velocity.covariance(axis, axis) == Approx(4e-8).epsilon(5 * 0.0183));

    REQUIRE(summary.velocity.galactic);
    CHECK(separation(direction_of(summary.velocity.galactic->lon_deg,
                                  summary.velocity.galactic->lat_deg),
                     cmb_direction) < 0.01);
    const double radius68 = *summary.velocity.region68->radius_deg;
    const double radius95 = *summary.velocity.region95->radius_deg;
    // Rayleigh distribution of the angle, to first order: sd sqrt(-2 ln(1 - P)).
    const double sd_deg = 2e-4 / cmb_speed / radians_per_degree;
    CHECK(radius68 == Approx(sd_deg * 1.5151).epsilon(0.04));
    CHECK(radius95 == Approx(sd_deg * 2.4861).epsilon(0.05));

    REQUIRE(summary.offset_from_cmb);
    // Median of the Rayleigh distribution: sd sqrt(2 ln 2), about the true direction.
    CHECK(summary.offset_from_cmb->angle_median_deg == Approx(sd_deg * 1.1774).epsilon(0.04));
    CHECK(summary.offset_from_cmb->speed_ratio_median ==
          Approx(summary.velocity.amplitude.median / cmb_speed).epsilon(1e-12));

    REQUIRE(summary.bins.size() == 2);
    CHECK(summary.bins[0].sources == 2000 * 768);
    CHECK(summary.bins[0].pixels == 768);
    CHECK(summary.bins[0].sky_fraction == 1.0);
    CHECK(summary.bins[0].weight_prior_sd == Approx(0.05));
    CHECK(summary.bins[0].weight.median == Approx(2.5).margin(0.005));
    CHECK(summary.bins[1].weight.is_constant());
    CHECK(summary.separation.surveys.size() == 1);

    CHECK(summary.sampling.converged);
    CHECK(summary.sampling.n_draws == 6000);
    CHECK(summary.sampling.walker_rhat_max < 1.05);
    CHECK(summary.sampling.effective_draws_min > 3000.0);
    CHECK(summary.sampling.moment_evaluations == 990);
    CHECK(summary.sampling.pixel_evaluations == 10);
    CHECK(warns(summary, "do not hold velocity.x"));
    for (const auto& scalar : summary.sampling.scalars)
        CHECK(scalar.name != "weight.dunlin.bright");
}

TEST_CASE("a posterior as narrow as the CMB dipole keeps its size", "[summary]") {
    const Direction along_lat = direction_of(264.021, 48.253 - 90.0) * -1.0;
    const Direction along_lon = along_lat.cross(cmb_direction);
    const double cos_lat = std::cos(48.253 * radians_per_degree);
    const Run run(
        [&](Stream& stream, Eigen::Ref<Eigen::VectorXd> row) {
            const double lon = 0.011 * cos_lat * radians_per_degree * normal(stream);
            const double lat = 0.005 * radians_per_degree * normal(stream);
            const double speed = cmb_speed + 3.669e-7 * normal(stream);
            row.head<3>() = speed * (cmb_direction + lon * along_lon + lat * along_lat);
            add_normal(stream, 1e-3, row.segment<3>(3));
        },
        VectorPrior(
            "cmb-velocity",
            GaussianPrior{cmb_speed * cmb_direction, 1e-13 * Eigen::Matrix3d::Identity()}));
    const Summary summary = run.summary();
    // -2 pi ln(1 - P) sd sd (chi-squared with 2 degrees of freedom); 6,000 draws: 3 sd = 6 %.
    const double product = 0.011 * cos_lat * 0.005;
    CHECK(summary.velocity.region68->area_deg2 ==
          Approx(2.0 * std::numbers::pi * -std::log1p(-level68) * product).epsilon(0.06));
    CHECK(summary.velocity.region95->area_deg2 ==
          Approx(2.0 * std::numbers::pi * -std::log1p(-level95) * product).epsilon(0.06));
    CHECK(summary.velocity.galactic->lon_deg == Approx(264.021).margin(0.001));
    CHECK(summary.velocity.icrs->lon_deg == Approx(cmb_ra).margin(0.001));
    CHECK(summary.velocity.icrs->lat_deg == Approx(cmb_dec).margin(0.001));
    CHECK(summary.velocity.prior_description.find("length 0.00123359 c") != std::string::npos);
    // A measurement as prior rules by intent: no warning of it. The intrinsic dipole is not
    // seen.
    CHECK_FALSE(warns(summary, "prior cmb-velocity"));
    CHECK(warns(summary, "No detection of the intrinsic dipole of dunlin"));
}

TEST_CASE("directions of a job in ICRS", "[summary]") {
    Run run([](Stream& stream, Eigen::Ref<Eigen::VectorXd> row) {
        row.head<3>() = cmb_speed * direction_of(cmb_ra, cmb_dec);
        add_normal(stream, 1e-9, row.head<3>());
        add_normal(stream, 1e-3, row.segment<3>(3));
    });
    run.chain.counts.frame = Frame::icrs;
    const Summary summary = run.summary();
    CHECK(summary.velocity.galactic->lon_deg == Approx(264.021).margin(1e-5));
    CHECK(summary.velocity.galactic->lat_deg == Approx(48.253).margin(1e-5));
    CHECK(summary.velocity.icrs->lon_deg == Approx(cmb_ra).margin(1e-5));
}

TEST_CASE("vectors of length zero are left out of directions, and said so", "[summary]") {
    int number = 0;
    const Run run([&](Stream& stream, Eigen::Ref<Eigen::VectorXd> row) {
        ordinary(stream, row);
        if (number++ % 2000 == 0) row.segment<3>(3).setZero();
    });
    const Summary summary = run.summary();
    CHECK(summary.intrinsic[0].draws_without_direction == 3);
    CHECK(summary.intrinsic[0].amplitude.median == Approx(5e-3).epsilon(0.02));
    CHECK(warns(summary, "3 draws of the intrinsic dipole of dunlin have length zero"));
}

TEST_CASE("fixed vectors and fixed directions are constants", "[summary]") {
    const Direction axis = direction_of(100.0, -30.0);
    const Run run(
        [&](Stream& stream, Eigen::Ref<Eigen::VectorXd> row) {
            row.segment<3>(3) = std::abs(0.004 + 0.0005 * normal(stream)) * axis;
        },
        VectorPrior("no-motion", FixedPrior{}),
        VectorPrior("along", AxisPrior{axis, 0.05}));
    const Summary summary = run.summary();
    CHECK_FALSE(summary.velocity.amplitude_free);
    CHECK(summary.velocity.amplitude.is_constant());
    CHECK_FALSE(summary.offset_from_cmb);
    CHECK_FALSE(summary.velocity.region68);
    CHECK_FALSE(summary.separation.joint.velocity_prior_share);
    CHECK(summary.intrinsic[0].amplitude_free);
    CHECK_FALSE(summary.intrinsic[0].direction_free);
    CHECK(summary.intrinsic[0].galactic->lon_deg == Approx(100.0).margin(1e-9));
    CHECK_FALSE(summary.intrinsic[0].region68);
    CHECK_FALSE(to_json(summary).empty());
    CHECK(to_text(summary).find("fixed at length 0 c") != std::string::npos);
}

TEST_CASE("a quiet run has no warnings and each fault has its own", "[summary]") {
    Run run(ordinary);
    run.options.job_warnings = {"an exclusion removed nothing"};
    const Summary calm = run.summary();
    CHECK(calm.separation.joint.verdict.starts_with("not"));  // the draws are too narrow
    CHECK(warns(calm, "Velocity and intrinsic dipole are not separated"));
    CHECK(calm.warnings.back() == "an exclusion removed nothing");
    CHECK(calm.warnings.size() == 2);

    run.chain.outcome.end = Outcome::End::max_steps;
    run.chain.outcome.warm_up_settled = false;
    run.chain.outcome.tally.taken = {6, 100, 0};
    run.chain.counts.surveys[0].cuts.warnings = {"disc removes no pixel"};
    const Summary doubtful = run.summary();
    CHECK(
        doubtful.warnings.front().starts_with("Not converged: the sampler reached max_steps"));
    CHECK(warns(doubtful, "effective draws of"));  // 10,000 wanted, 6,000 stored
    CHECK(warns(doubtful, "The warm-up did not settle"));
    CHECK(warns(doubtful, "The stretch kernel had only 1.0 %"));
    CHECK(warns(doubtful, "dunlin: disc removes no pixel"));
    CHECK_FALSE(doubtful.sampling.converged);
    run.chain.outcome.end = Outcome::End::interrupted;
    CHECK(warns(run.summary(), "was interrupted"));
}

TEST_CASE("replicates that disagree are named with their scalar", "[summary]") {
    int number = 0;
    Run run([&](Stream& stream, Eigen::Ref<Eigen::VectorXd> row) {
        ordinary(stream, row);
        if (number++ % 120 >= 60) row[4] += 5e-4;  // the second replicate
    });
    run.chain.outcome.end = Outcome::End::max_steps;
    const Summary summary = run.summary();
    CHECK(summary.sampling.replicate_rhat_max > 1.05);
    CHECK(warns(summary, "of intrinsic.dunlin"));
}

TEST_CASE("amplitudes that come from the prior are called so", "[summary]") {
    const double max = 0.05;
    const Run flat(
        [&](Stream& stream, Eigen::Ref<Eigen::VectorXd> row) {
            ordinary(stream, row);
            do {
                for (Eigen::Index axis = 3; axis < 6; ++axis)
                    row[axis] = max * (2.0 * uniform(stream) - 1.0);
            } while (row.segment<3>(3).norm() > max);
        },
        free_velocity,
        VectorPrior("free-intrinsic", UniformVectorPrior{max}));
    CHECK(warns(flat.summary(), "The counts say little about the intrinsic dipole of dunlin"));

    const Run edge(
        [&](Stream& stream, Eigen::Ref<Eigen::VectorXd> row) {
            ordinary(stream, row);
            row.segment<3>(3) << max - std::abs(2e-3 * normal(stream)), 0.0, 0.0;
            row[4] = 1e-3 * normal(stream);
            row[5] = 1e-3 * normal(stream);
        },
        free_velocity,
        VectorPrior("free-intrinsic", UniformVectorPrior{max}));
    CHECK(warns(edge.summary(), "leans on the edge of its prior free-intrinsic (at 0.05)"));
}

TEST_CASE("an amplitude that stands high at zero has an upper limit", "[summary]") {
    const auto faint = [](double length) {
        return [length](Stream& stream, Eigen::Ref<Eigen::VectorXd> row) {
            ordinary(stream, row);
            Eigen::Vector3d turn = Eigen::Vector3d::Zero();
            add_normal(stream, 1.0, turn);
            row.segment<3>(3) = std::abs(length + 2e-3 * normal(stream)) * turn.normalized();
        };
    };
    const VectorPrior even("uniform-amplitude", UniformAmplitudePrior{0.05});
    const Summary summary = Run(faint(0.0), free_velocity, even).summary();
    REQUIRE(summary.intrinsic[0].amplitude_limits);
    // Two standard deviations; four standard errors of the order statistic: 0.1 of them.
    CHECK(summary.intrinsic[0].amplitude_limits->limit95 == Approx(4e-3).epsilon(0.05));
    CHECK(warns(summary,
                "No detection of the intrinsic dipole of dunlin: the density of its amplitude "
                "stands high at zero"));
    CHECK_FALSE(warns(summary, "volume factor"));
    CHECK_FALSE(summary.velocity.amplitude_limits);

    const Summary seen = Run(faint(1e-2), free_velocity, even).summary();
    CHECK_FALSE(seen.intrinsic[0].amplitude_limits);
    CHECK_FALSE(warns(seen, "No detection"));
}

TEST_CASE("a summary has the same bits for any number of threads", "[summary]") {
    Run run(ordinary);
    const std::string one = to_json(run.summary());
    run.options.threads = 3;
    CHECK(to_json(run.summary()) == one);
}

TEST_CASE("a chain without stored draws is refused", "[summary]") {
    Run run(ordinary);
    run.chain.provenance.job_name = "dunlin.toml";
    run.chain.draws = Draws{};
    CHECK_THROWS_WITH(run.summary(), Catch::Contains("dunlin.toml: the chain holds no stored"));
}
