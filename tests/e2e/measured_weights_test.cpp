// SPDX-License-Identifier: GPL-2.0-or-later
// Weights measured from the catalogue, through the built program: files, resuming, refusals,
// and the velocity that comes out.
#include <fmt/format.h>

#include <catch2/catch.hpp>
#include <cmath>
#include <filesystem>
#include <fstream>
#include <nlohmann/json.hpp>

#include "core/fits/fits_file.h"
#include "deviascope/core/parallel.h"
#include "deviascope/core/random.h"
#include "deviascope/mock/population.h"
#include "deviascope/sky/boost.h"
#include "file_bytes.h"
#include "program_on_job.h"
#include "run_process.h"
#include "temporary_folder.h"

using namespace deviascope;
using deviascope::test::ProcessResult;
using deviascope::test::TemporaryFolder;

namespace {

constexpr double degrees = 57.29577951308232;
const Eigen::Vector3d velocity(0.0, 0.012, 0.016);  // 0.02 c

/// What is written of a source.
struct Row {
    double lon, lat, flux, alpha, redshift;
};

/// A property draw: flux with curved counts, an index that grows with flux, redshift.
struct Properties {
    double flux, alpha, redshift, error;  // error: standard normal, of ln(1+z)
};

Properties properties_of(std::uint64_t source) {
    Stream stream(53001, Purpose::test, source, 0, 0);
    Properties p{};
    p.flux = flux_of(DoublePowerLawFlux{0.3, 1.0, 0.6, 2.2}, 1.0 - uniform(stream));
    p.alpha = 0.75 + 0.15 * std::log(p.flux) + 0.2 * normal(stream);
    const double first = 1.0 - uniform(stream);
    const double second = 1.0 - uniform(stream);
    p.redshift = redshift_of(RedshiftDistribution{0.9, 1.5}, first, second);
    p.error = normal(stream);
    return p;
}

Row observed(const Properties& p, const Direction& at_rest, double scatter) {
    const Boost boost(velocity);
    const double delta = boost.doppler_factor(at_rest);
    const Direction n = boost.aberrated(at_rest);
    const double z = boosted_redshift(p.redshift, delta);
    return {std::atan2(n.y(), n.x()) * degrees,
            std::asin(n.z()) * degrees,
            boosted_flux(p.flux, p.alpha, delta),
            p.alpha,
            std::expm1(std::log1p(z) + scatter * p.error)};
}

/// A full-sky catalogue seen by the moving observer. Every source stands at a random place and
/// at the opposite one, with the same properties: that takes most of the noise out of the
/// dipoles and leaves their expectation.
void write_catalogue(const std::filesystem::path& path, std::int64_t n_pairs, double scatter) {
    fits::TableWriter table(path,
                            "SOURCES",
                            {{"RA", "D", "deg"},
                             {"DEC", "D", "deg"},
                             {"S", "D", ""},
                             {"A", "D", ""},
                             {"Z", "D", ""}});
    std::array<std::vector<double>, 5> column;
    for (auto& values : column) values.resize(2 * static_cast<std::size_t>(n_pairs));
    constexpr std::size_t batch = 10'000;
    const auto n = static_cast<std::size_t>(n_pairs);
    parallel_for((n + batch - 1) / batch, default_threads(), [&](std::size_t b) {
        for (std::size_t i = b * batch; i < std::min((b + 1) * batch, n); ++i) {
            const Properties p = properties_of(i);
            Stream stream(53002, Purpose::test, i, 0, 0);
            const double z = 2.0 * uniform(stream) - 1.0;
            const double lon = 2.0 * M_PI * uniform(stream);
            const double r = std::sqrt(1.0 - z * z);
            const Direction place(r * std::cos(lon), r * std::sin(lon), z);
            for (std::size_t side = 0; side < 2; ++side) {
                const Row row = observed(p, side == 0 ? place : Direction(-place), scatter);
                const std::size_t at = 2 * i + side;
                column[0][at] = row.lon;
                column[1][at] = row.lat;
                column[2][at] = row.flux;
                column[3][at] = row.alpha;
                column[4][at] = row.redshift;
            }
        }
    });
    for (std::size_t c = 0; c < column.size(); ++c) table.write(c, 0, column[c]);
    table.close();
}

/// Five shells of redshift of a survey limited in flux.
std::string job_text(const std::string& weights,
                     const std::string& more = "",
                     double width = 0.1) {
    std::string job = R"([job]
seed = 7
nside = 32
frame = "icrs"
[velocity]
prior = "free-velocity"
[intrinsic]
prior = { kind = "gaussian", sd = 0.1 }
[ensemble]
effective_draws = 2000
[[survey]]
name = "lantern"
catalogue = "lantern.fits"
frame = "icrs"
columns = { lon = "RA", lat = "DEC", flux = "S", alpha = "A", redshift = "Z" }
select = { flux = [0.5, inf] }
)";
    job += "weights = \"" + weights + "\"\n" + more;
    for (int b = 1; b <= 5; ++b)
        job += fmt::format(
            "[[survey.bin]]\nname = \"z{}\"\nselect = {{ redshift = [{:.1f}, "
            "{:.1f}] }}\n",
            b,
            width * b,
            width * (b + 1));
    return job;
}

ProcessResult command(const TemporaryFolder& folder,
                      const std::string& name,
                      const std::string& out,
                      const std::vector<std::string>& more = {}) {
    return test::run_process(test::words_on_job(folder, name, out, more));
}

/// The velocity along the true one, over the true speed; and its standard deviation.
std::pair<double, double> recovered(const std::filesystem::path& folder) {
    std::ifstream file(folder / "summary.json");
    const auto summary = nlohmann::json::parse(file);
    REQUIRE(summary["sampling"]["converged"] == true);
    const auto& vector = summary["velocity"]["vector"];
    Eigen::Vector3d mean;
    Eigen::Matrix3d covariance;
    for (Eigen::Index i = 0; i < 3; ++i) {
        mean[i] = vector["mean"][static_cast<std::size_t>(i)];
        for (Eigen::Index j = 0; j < 3; ++j)
            covariance(i, j) =
                vector["covariance"][static_cast<std::size_t>(i)][static_cast<std::size_t>(j)];
    }
    const Eigen::Vector3d along = velocity.normalized();
    return {mean.dot(along) / velocity.norm(),
            std::sqrt(along.dot(covariance * along)) / velocity.norm()};
}

/// The same with shells 0.3 wide, for small catalogues.
std::string wide_job(const std::string& weights) {
    return job_text(weights, "", 0.3);
}

double number_in(const std::string& file, const std::string& key) {
    const auto at = file.find(key);
    REQUIRE(at != std::string::npos);
    return std::stod(file.substr(at + key.size()));
}

/// Runs with weights measured from the catalogue with scatter, and with those measured from the
/// same catalogue without.
/// @param expected_ratio  of the two velocities
void check_recovery(double scatter, double expected_ratio, std::int64_t n_pairs) {
    const TemporaryFolder folder;
    write_catalogue(folder / "lantern.fits", n_pairs, 0.0);
    folder.write("job.toml", job_text("measure"));
    ProcessResult result = command(folder, "weigh", "free", {"--quiet"});
    INFO(result.err);
    REQUIRE(result.exit_code == 0);
    write_catalogue(folder / "lantern.fits", n_pairs, scatter);
    folder.write(
        "job.toml",
        job_text("measure", fmt::format("scatter = {{ redshift = \"{}*(1+z)\" }}\n", scatter)));
    result = command(folder, "run", "observed");
    INFO(result.err);
    REQUIRE(result.exit_code == 0);
    CHECK_THAT(result.out, Catch::Contains("of the true one"));
    folder.write("job.toml", job_text("free/lantern-weights.toml"));
    result = command(folder, "run", "wrong", {"--quiet"});
    INFO(result.err);
    REQUIRE(result.exit_code == 0);
    const auto [right, sd] = recovered(folder / "observed");
    const auto [wrong, wrong_sd] = recovered(folder / "wrong");
    INFO("scatter " << scatter << ": measured " << right << " +- " << sd << ", scatter-free "
                    << wrong << " +- " << wrong_sd);
    // Pairs leave about a third of the noise that the posterior allows for.
    CHECK(std::abs(right - 1.0) < 0.8 * sd);
    CHECK(std::abs(wrong / right - expected_ratio) < 0.4 * sd);
    // And what the program foretells from the catalogue with scatter alone.
    // The parabola misses up to a quarter of the shift. The bootstrap takes both sources of a
    // pair, whose properties are the same, for two: its error is too small by the root of 2.
    const std::string file = test::bytes_of(folder / "observed" / "lantern-weights.toml");
    const double foretold = number_in(file, "free_intrinsic = ");
    const double foretold_sd = std::sqrt(2.0) * number_in(file, "free_intrinsic_sd = ");
    INFO("foretold " << foretold << " +- " << foretold_sd);
    CHECK(foretold_sd > 0.0);
    CHECK(std::abs(foretold - expected_ratio) <
          0.25 * (1.0 - expected_ratio) + 3.0 * foretold_sd);
}

}  // namespace

// Fitted over true velocity for weights of the true redshifts, five shells 0.1 wide from 0.1 to
// 0.6, P(<z) as here: 0.9937, 0.9457, 0.8613 for scatter 0.01, 0.03, 0.05 of 1+z, by numerical
// integration outside this program (for a power law of flux; the edges in redshift rule). That
// 0.05 shifts a velocity by about a tenth is common practice.
TEST_CASE(
    "photometric redshifts: measured weights recover the velocity, scatter-free ones do not",
    "[app]") {
    check_recovery(0.05, 0.8613, 500'000);
}

TEST_CASE("photometric redshifts of three qualities", "[.long][app]") {
    check_recovery(0.01, 0.9937, 1'500'000);
    check_recovery(0.03, 0.9457, 1'500'000);
    check_recovery(0.05, 0.8613, 1'500'000);
}

TEST_CASE("weigh writes weights that a job can name, and the same bits each time", "[app]") {
    const TemporaryFolder folder;
    write_catalogue(folder / "lantern.fits", 60'000, 0.0);
    folder.write("job.toml", wide_job("measure"));
    const ProcessResult first = command(folder, "weigh", "one", {"--check", "--threads", "1"});
    INFO(first.err);
    REQUIRE(first.exit_code == 0);
    CHECK_THAT(first.out,
               Catch::Contains("Kinematic weights of lantern") &&
                   Catch::Contains("full-sky experiment") && Catch::Contains("central"));
    const std::string text = test::bytes_of(folder / "one" / "lantern-weights.toml");
    REQUIRE(command(folder, "weigh", "two", {"--check", "--threads", "2"}).exit_code == 0);
    CHECK(test::bytes_of(folder / "two" / "lantern-weights.toml") == text);
    CHECK(command(folder, "weigh", "one").exit_code == 5);
    CHECK(command(folder, "weigh", "one", {"--replace", "--quiet"}).out.empty());
    folder.write("job.toml", wide_job("one/lantern-weights.toml"));
    CHECK(command(folder, "run", "results", {"--quiet"}).exit_code == 0);
    // A job whose weights file is still to be made is good enough to measure.
    folder.write("job.toml", wide_job("not-there.toml"));
    CHECK(command(folder, "weigh", "three").exit_code == 0);
    CHECK(command(folder, "run", "four").exit_code == 2);
}

TEST_CASE("a run with measured weights is resumed with them, whatever is left of its folder",
          "[app]") {
    const TemporaryFolder folder;
    write_catalogue(folder / "lantern.fits", 60'000, 0.0);
    folder.write("job.toml", wide_job("measure"));
    const ProcessResult run = command(folder, "run", "out", {"--quiet"});
    INFO(run.err);
    REQUIRE(run.exit_code == 0);
    const std::string weights = test::bytes_of(folder / "out" / "lantern-weights.toml");
    const std::string summary = test::bytes_of(folder / "out" / "summary.json");
    ProcessResult again = command(folder, "run", "out", {"--resume"});
    CHECK(again.exit_code == 0);
    CHECK_THAT(again.out, Catch::Contains("Weights of lantern taken from"));
    std::filesystem::remove(folder / "out" / "lantern-weights.toml");
    CHECK(command(folder, "run", "out", {"--resume", "--quiet"}).exit_code == 0);
    CHECK(test::bytes_of(folder / "out" / "lantern-weights.toml") == weights);
    CHECK(test::bytes_of(folder / "out" / "summary.json") == summary);

    SECTION("the chain alone is enough for its summary") {
        std::filesystem::remove(folder / "lantern.fits");
        const ProcessResult summarised =
            test::run_process({DEVIASCOPE_PROGRAM,
                               "summarise",
                               (folder / "out" / "chains.h5").string(),
                               "-o",
                               (folder / "again").string(),
                               "--quiet"});
        INFO(summarised.err);
        CHECK(summarised.exit_code == 0);
        CHECK(test::bytes_of(folder / "again" / "summary.json") == summary);
    }
    SECTION("weights that were edited are refused") {
        std::ofstream(folder / "out" / "lantern-weights.toml", std::ios::app) << "# mine\n";
        again = command(folder, "run", "out", {"--resume"});
        CHECK(again.exit_code == 2);
        CHECK_THAT(again.err, Catch::Contains("another text of measured weights of lantern"));
    }
    SECTION("a catalogue that has changed is measured anew only where that is said") {
        write_catalogue(folder / "lantern.fits", 60'000, 0.01);
        again = command(folder, "run", "out", {"--resume"});
        CHECK(again.exit_code == 2);
        CHECK_THAT(again.err, Catch::Contains("was measured from other inputs"));
        CHECK(command(folder, "run", "out", {"--replace", "--quiet"}).exit_code == 0);
        CHECK(test::bytes_of(folder / "out" / "lantern-weights.toml") != weights);
    }
}

TEST_CASE("a weight of its own overrides a measured one, and check measures too", "[app]") {
    const TemporaryFolder folder;
    write_catalogue(folder / "lantern.fits", 60'000, 0.0);
    std::string job = wide_job("measure");
    job += "weight = { mean = 4.5, sd = 0.125 }\n";  // of the last bin
    folder.write("job.toml", job);
    const ProcessResult check =
        test::run_process({DEVIASCOPE_PROGRAM, "check", (folder / "job.toml").string()});
    INFO(check.err);
    CHECK(check.exit_code == 0);
    CHECK_THAT(check.out, Catch::Contains("4.5 +- 0.12") && Catch::Contains("errors from 200"));
    REQUIRE(command(folder, "weigh", "out", {"--quiet"}).exit_code == 0);
    const std::string file = test::bytes_of(folder / "out" / "lantern-weights.toml");
    CHECK(file.find("name = \"z4\"") != std::string::npos);
    CHECK(file.find("name = \"z5\"") == std::string::npos);
}

TEST_CASE("a catalogue too small to measure is answered with its reason", "[app]") {
    const TemporaryFolder folder;
    write_catalogue(folder / "lantern.fits", 1'000, 0.0);
    folder.write("job.toml", wide_job("measure"));
    const ProcessResult result = command(folder, "run", "out");
    CHECK(result.exit_code == 3);
    CHECK_THAT(result.err,
               Catch::Contains("survey lantern, bin z1: ") &&
                   Catch::Contains("too few to measure its weight from"));
    CHECK_FALSE(std::filesystem::exists(folder / "out" / "lantern-weights.toml"));
}
