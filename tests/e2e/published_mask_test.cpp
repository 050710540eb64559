// SPDX-License-Identifier: GPL-2.0-or-later
// A mock survey behind a published mask: the WMAP seven-year temperature analysis mask (Jarosik
// et al. 2011, ApJS 192, 14; Gold et al. 2011, ApJS 192, 15) at nside 32, as Debian's
// healpy-data installs it among the test data of healpy.
#include <Eigen/LU>
#include <catch2/catch.hpp>
#include <fstream>
#include <nlohmann/json.hpp>

#include "deviascope/sky/direction.h"
#include "run_process.h"
#include "temporary_folder.h"

using namespace deviascope;
using deviascope::test::TemporaryFolder;

namespace {

constexpr const char* mask =
    "/usr/share/healpy/test/data/wmap_temperature_analysis_mask_r9_7yr_v4_udgraded32.fits";

std::string scenario() {
    return std::string(R"([scenario]
seed = 20260818
frame = "galactic"
[velocity]
speed_km_s = 3000.0
lon_deg = 210.0
lat_deg = 35.0
[[survey]]
name = "dunlin"
sources = 1.2e6
intrinsic = { amplitude = 0.03, lon_deg = 60.0, lat_deg = -20.0 }
alpha = { mean = 0.8 }
flux = { kind = "broken-power-law", minimum = 8.0, break = 40.0, faint_slope = 0.7, bright_slope = 2.0 }
keep = { flux = [10.0, inf] }
exposure = ")") +
           mask + R"("
map_frame = "galactic"
file = "dunlin.fits"
frame = "icrs"
columns = { lon = "RA", lat = "DEC", flux = "S" }
)";
}

/// Weights 2 + x (1 + alpha) (Ellis & Baldwin 1984, MNRAS 206, 377), x = 0.7 and 2, alpha =
/// 0.8.
std::string job() {
    return std::string(R"([job]
seed = 20260818
nside = 32
[velocity]
prior = "free-velocity"
[intrinsic]
prior = "free-intrinsic"
[ensemble]
effective_draws = 1000
[[survey]]
name = "dunlin"
catalogue = "dunlin.fits"
frame = "icrs"
columns = { lon = "RA", lat = "DEC", flux = "S" }
exposure = ")") +
           mask + R"("
map_frame = "galactic"
[[survey.bin]]
name = "faint"
select = { flux = [10.0, 40.0] }
weight = { mean = 3.26, sd = 0.0 }
[[survey.bin]]
name = "bright"
select = { flux = [40.0, inf] }
weight = { mean = 5.6, sd = 0.0 }
)";
}

Eigen::Vector3d vector_of(const nlohmann::json& numbers) {
    return Eigen::Vector3d(
        numbers[0].get<double>(), numbers[1].get<double>(), numbers[2].get<double>());
}

/// Distance of a truth from the posterior mean, in units of the posterior's covariance.
double chi_squared(const nlohmann::json& vector, const Eigen::Vector3d& truth) {
    Eigen::Matrix3d covariance;
    for (Eigen::Index row = 0; row < 3; ++row)
        covariance.row(row) = vector_of(vector["covariance"][static_cast<std::size_t>(row)]);
    const Eigen::Vector3d offset = vector_of(vector["mean"]) - truth;
    return offset.dot(covariance.inverse() * offset);
}

void run(const std::vector<std::string>& words) {
    const auto result = test::run_process(words);
    INFO(result.out + result.err);
    REQUIRE(result.exit_code == 0);
}

}  // namespace

TEST_CASE("a mock survey behind a published mask gives its truth back", "[app]") {
    const TemporaryFolder folder;
    const auto sky = folder.write("sky.toml", scenario()),
               fit = folder.write("fit.toml", job());
    run({DEVIASCOPE_PROGRAM, "mock", sky.string(), "-o", folder.path().string()});
    run({DEVIASCOPE_PROGRAM, "run", fit.string(), "-o", (folder / "out").string(), "--quiet"});
    std::ifstream file(folder / "out/summary.json");
    const nlohmann::json summary = nlohmann::json::parse(file);
    CHECK(summary["sampling"]["converged"] == true);
    CHECK(summary["bins"][0]["sky_fraction"].get<double>() < 0.8);
    constexpr double speed_of_light_km_s = 299792.458;
    // 99.9 % point of chi-squared with 3 degrees of freedom: 16.266 (scipy.stats.chi2).
    CHECK(chi_squared(summary["velocity"]["vector"],
                      3000.0 / speed_of_light_km_s * direction_of(210.0, 35.0)) < 16.266);
    CHECK(chi_squared(summary["intrinsic"]["dunlin"]["vector"],
                      0.03 * direction_of(60.0, -20.0)) < 16.266);
}
