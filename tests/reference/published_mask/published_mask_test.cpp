// SPDX-License-Identifier: GPL-2.0-or-later
// The WMAP seven-year temperature analysis mask, read as exposure; see README.md here.
#include <catch2/catch.hpp>
#include <cmath>
#include <fstream>

#include "deviascope/counts/count_sources.h"
#include "deviascope/sky/healpix_map.h"
#include "python_check.h"
#include "temporary_folder.h"

using namespace deviascope;

namespace {

std::vector<double> read_raw(const std::filesystem::path& path) {
    std::vector<double> values(std::filesystem::file_size(path) / sizeof(double));
    std::ifstream file(path, std::ios::binary);
    file.read(reinterpret_cast<char*>(values.data()),
              static_cast<std::streamsize>(values.size() * sizeof(double)));
    return values;
}

bool same_values(const std::vector<double>& a, const std::vector<double>& b) {
    return std::equal(a.begin(), a.end(), b.begin(), b.end(), [](double p, double q) {
        return p == q || (std::isnan(p) && std::isnan(q));
    });
}

/// Exposure of each pixel of a job with this map, 0 where it keeps none.
std::vector<double> exposure_of(const std::filesystem::path& map,
                                const std::filesystem::path& catalogue,
                                int nside,
                                Frame frame,
                                std::optional<Frame> map_frame) {
    SurveyInput survey;
    survey.name = "dunlin";
    survey.catalogue = {catalogue};
    survey.columns = {{"lon", "RA"}, {"lat", "DEC"}};
    survey.exposure = map;
    survey.map_frame = map_frame;
    survey.bins = {{"all", {}, {}, {}}};
    const Pixelisation grid(nside);
    const SurveyCounts counts = count_survey(survey, grid, frame, {});
    std::vector<double> exposure(static_cast<std::size_t>(grid.n_pixels()), 0.0);
    const Footprint& footprint = counts.footprints[0];
    for (std::size_t i = 0; i < footprint.pixel.size(); ++i)
        exposure[static_cast<std::size_t>(footprint.pixel[i])] = footprint.exposure[i];
    return exposure;
}

double largest_difference(const std::vector<double>& a, const std::vector<double>& b) {
    REQUIRE(a.size() == b.size());
    double largest = 0.0;
    for (std::size_t i = 0; i < a.size(); ++i)
        largest = std::max(largest, std::abs(a[i] - b[i]));
    return largest;
}

}  // namespace

TEST_CASE("a published mask and map are read as healpy reads them", "[sky][counts]") {
    const test::TemporaryFolder folder;
    const auto python =
        test::run_python(DEVIASCOPE_TEST_DATA "/reference/published_mask/read_mask.py",
                         {folder.path().string()});
    INFO(python.output);
    REQUIRE(python.exit_code == 0);

    const std::vector<double> mask = read_raw(folder / "mask.values");
    REQUIRE(mask.size() == 12288);
    const HealpixMap ring = read_healpix_map(folder / "mask.fits");
    CHECK_FALSE(ring.frame);
    CHECK(same_values(ring.value, mask));
    const HealpixMap nested = read_healpix_map(folder / "mask-nested.fits");
    CHECK(nested.frame == Frame::galactic);
    CHECK(same_values(nested.value, mask));
    CHECK(same_values(read_healpix_map(folder / "band.fits").value,
                      read_raw(folder / "band.values")));

    const auto catalogue = folder.write("a.csv", "RA,DEC\n10,60\n");
    const auto galactic = Frame::galactic;
    for (const char* name : {"mask.fits", "mask-nested.fits"}) {
        INFO(name);
        const auto map = folder / name;
        CHECK(exposure_of(map, catalogue, 32, galactic, galactic) == mask);
        CHECK(exposure_of(map, catalogue, 64, galactic, galactic) ==
              read_raw(folder / "exposure-64-galactic"));
        CHECK(largest_difference(exposure_of(map, catalogue, 16, galactic, galactic),
                                 read_raw(folder / "exposure-16-galactic")) < 1e-15);
        CHECK(largest_difference(exposure_of(map, catalogue, 32, Frame::icrs, galactic),
                                 read_raw(folder / "exposure-32-icrs")) < 1e-15);
    }
    CHECK_THROWS_WITH(exposure_of(folder / "mask.fits", catalogue, 32, galactic, {}),
                      Catch::Contains("no COORDSYS"));
}
