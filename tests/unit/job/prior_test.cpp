// SPDX-License-Identifier: GPL-2.0-or-later
#include <Eigen/Geometry>
#include <algorithm>
#include <catch2/catch.hpp>
#include <cmath>
#include <string>
#include <vector>

#include "deviascope/core/physical_constants.h"
#include "job/prior_search.h"
#include "plain_job.h"
#include "temporary_folder.h"

using namespace deviascope;

namespace {

const std::vector<std::string> shipped_names = {"clustering-modest",
                                                "cmb-velocity",
                                                "free-intrinsic",
                                                "free-velocity",
                                                "no-intrinsic",
                                                "no-motion"};

VectorPrior prior_named(const std::string& name, Frame frame) {
    return parse_prior(shipped(name).value(), frame);
}

}  // namespace

TEST_CASE("every shipped prior loads, in every frame, and says where it comes from", "[job]") {
    CHECK(known_priors("/nowhere") == shipped_names);
    for (const std::string& name : shipped_names) {
        const Companion companion = shipped(name).value();
        CHECK(companion.name == name);
        CHECK(companion.text.find("\nsource = \"") != std::string::npos);
        CHECK(companion.text.find("\n# Source: ") != std::string::npos);
        for (const Frame frame : {Frame::galactic, Frame::icrs, Frame::ecliptic}) {
            const VectorPrior prior = parse_prior(companion, frame);
            CHECK(prior.name() == name);
            CHECK(prior.median_amplitude(1) < 0.1);
        }
    }
    CHECK(prior_named("no-motion", Frame::icrs).n_coordinates() == 0);
    CHECK(prior_named("no-intrinsic", Frame::icrs).n_coordinates() == 0);
    CHECK(std::get<UniformVectorPrior>(prior_named("free-intrinsic", Frame::icrs).kind()).max ==
          0.1);
    // Median of the chi distribution with 3 degrees of freedom: 1.538172 (scipy 1.10.1).
    CHECK(prior_named("clustering-modest", Frame::icrs).median_amplitude(1) ==
          Approx(1.538172e-3).epsilon(1e-6));
}

TEST_CASE("cmb-velocity is the published vector and covariance", "[job]") {
    // Planck 2018 I, A&A 641, A1, Table 2: 369.82 +- 0.11 km/s towards l = 264.021 +- 0.011,
    // b = 48.253 +- 0.005 deg; its note e gives RA, Dec = 167.942 +- 0.007, -6.944 +- 0.007
    // deg. Vectors: numpy with c = 299792.458 km/s, and eraG2icrs of liberfa 2.0.0 for ICRS.
    const auto galactic =
        std::get<GaussianPrior>(prior_named("cmb-velocity", Frame::galactic).kind());
    const Eigen::Vector3d expected(
        -8.555761883940e-05, -8.169064395520e-04, 9.203694911493e-04);
    CHECK((galactic.mean - expected).norm() < 1e-15);
    const auto icrs = std::get<GaussianPrior>(prior_named("cmb-velocity", Frame::icrs).kind());
    const Eigen::Vector3d expected_icrs(
        -1.197519603253e-03, 2.558099358408e-04, -1.491452778688e-04);
    CHECK((icrs.mean - expected_icrs).norm() < 1e-15);

    // The published errors are the principal axes: radial, along longitude, along latitude.
    const double beta = 369.82 / speed_of_light_km_s;
    const double b = 48.253 * radians_per_degree, l = 264.021 * radians_per_degree;
    const Eigen::Vector3d radial(
        std::cos(b) * std::cos(l), std::cos(b) * std::sin(l), std::sin(b));
    const Eigen::Vector3d along_l(-std::sin(l), std::cos(l), 0);
    const Eigen::Vector3d along_b = radial.cross(along_l);
    const double sd[] = {0.11 / speed_of_light_km_s,
                         beta * std::cos(b) * 0.011 * radians_per_degree,
                         beta * 0.005 * radians_per_degree};
    const Eigen::Vector3d axes[] = {radial, along_l, along_b};
    for (int i = 0; i < 3; ++i) {
        CHECK(std::sqrt(axes[i].dot(galactic.covariance * axes[i])) ==
              Approx(sd[i]).epsilon(1e-10));
        CHECK(std::abs(axes[i].dot(galactic.covariance * axes[(i + 1) % 3])) <
              1e-10 * sd[0] * sd[0]);
    }
    // Seen in ICRS: the printed errors of RA and Dec, 0.007 deg as coordinates, to their
    // rounding.
    const Eigen::Vector3d unit = icrs.mean.normalized();
    const Eigen::Vector3d east = Eigen::Vector3d::UnitZ().cross(unit).normalized();
    const Eigen::Vector3d north = unit.cross(east);
    const double cos_dec = std::hypot(unit.x(), unit.y());
    const double ra_sd =
        std::sqrt(east.dot(icrs.covariance * east)) / beta / cos_dec / radians_per_degree;
    const double dec_sd =
        std::sqrt(north.dot(icrs.covariance * north)) / beta / radians_per_degree;
    CHECK(ra_sd == Approx(0.00672).margin(5e-6));   // linear propagation, numpy
    CHECK(dec_sd == Approx(0.00584).margin(5e-6));  // likewise; printed, rounded up: 0.007
    CHECK(std::atan2(unit.y(), unit.x()) / radians_per_degree == Approx(167.942).margin(5e-4));
    CHECK(std::asin(unit.z()) / radians_per_degree == Approx(-6.944).margin(5e-4));
}

TEST_CASE("an axis turns into the job's frame, a fixed vector is in it already", "[job]") {
    const auto velocity = [](const std::string& prior) {
        return parsed(with(plain_job, "{ kind = \"uniform-vector\", max = 0.05 }", prior))
            .model.velocity;
    };
    const auto axis =
        std::get<AxisPrior>(velocity("{ kind = 'axis', lon_deg = 192.85948, lat_deg = "
                                     "27.12825, frame = 'icrs', max = 0.01 }")
                                .kind());
    // North galactic pole: Hipparcos catalogue, ESA SP-1200 vol. 1, Eq. 1.5.11.
    CHECK((axis.axis - Eigen::Vector3d::UnitZ()).norm() < 1e-7);
    CHECK(axis.max == 0.01);
    const auto fixed =
        std::get<FixedPrior>(velocity("{ kind = 'fixed', value = [0.001, 0, -0.002] }").kind());
    CHECK(fixed.value == Eigen::Vector3d(0.001, 0, -0.002));
    const auto amplitude = velocity("{ kind = 'uniform-amplitude', max = 1 }");
    CHECK(std::get<UniformAmplitudePrior>(amplitude.kind()).max == 1.0);
    CHECK(amplitude.name() == "uniform-amplitude");
    const auto gaussian = std::get<GaussianPrior>(
        velocity("{ kind = 'gaussian', mean = [0.001, 0, 0], covariance = [[4e-8, 1e-8, 0], "
                 "[1e-8, 9e-8, 0], [0, 0, 1e-12]] }")
            .kind());
    CHECK(gaussian.mean.x() == 0.001);
    CHECK(gaussian.covariance(0, 1) == 1e-8);
    CHECK(gaussian.covariance(2, 2) == 1e-12);
}

TEST_CASE(
    "priors are found beside the job, in its priors folder, then where the program keeps them",
    "[job]") {
    const test::TemporaryFolder folder;
    std::filesystem::create_directory(folder / "priors");
    CHECK(find_prior("free-velocity", folder.path())->path == DEVIASCOPE_SOURCE_FOLDER
          "/priors/free-velocity.toml");
    const auto inside =
        folder.write("priors/free-velocity.toml", "kind = 'uniform-vector'\nmax = 0.02\n");
    CHECK(find_prior("free-velocity", folder.path())->path == inside.string());
    const auto beside =
        folder.write("free-velocity.toml", "kind = 'uniform-vector'\nmax = 0.01\n");
    CHECK(find_prior("free-velocity", folder.path())->path == beside.string());
    CHECK_FALSE(find_prior("own-velocity", folder.path()).has_value());

    const auto folders = prior_folders(folder.path());
    REQUIRE(folders.size() == 4);
    const auto program = std::filesystem::read_symlink("/proc/self/exe");
    CHECK(folders[2] == program.parent_path().parent_path() / "share/deviascope/priors");
    folder.write("priors/own-velocity.toml", "");
    const auto known = known_priors(folder.path());
    CHECK(std::count(known.begin(), known.end(), "own-velocity") == 1);
    CHECK(std::count(known.begin(), known.end(), "free-velocity") == 1);
}

TEST_CASE("an unknown prior is answered with the known ones, a faulty one with its faults",
          "[job]") {
    const test::TemporaryFolder folder;
    folder.write("dunlin.fits", "");
    std::string text =
        with(plain_job, "{ kind = \"uniform-vector\", max = 0.05 }", "'free-velocty'");
    text = with(text, "{ kind = \"gaussian\", sd = 0.01 }", "'odd'");
    folder.write("odd.toml", "kind = 'gaussian'\nsd = 0\nmax = 1\n");
    const std::string path = folder.write("j.toml", text).string();
    CHECK_THROWS_WITH(
        read_job(path),
        path +
            ":5:9: velocity.prior: found \"free-velocty\"; a known prior, "
            "\"clustering-modest\", "
            "\"cmb-velocity\", \"free-intrinsic\", \"free-velocity\", \"no-intrinsic\" or "
            "\"no-motion\", is allowed; did you mean \"free-velocity\"?\n" +
            (folder / "odd.toml").string() +
            ":2:6: sd: found 0; a finite number above 0 is allowed\n" +
            (folder / "odd.toml").string() +
            ":3:1: max: unknown key; known here: \"kind\", \"source\", \"sd\", \"mean\", "
            "\"covariance\"");
}
