// SPDX-License-Identifier: GPL-2.0-or-later
#include <bit>
#include <catch2/catch.hpp>
#include <cmath>
#include <fstream>
#include <limits>
#include <string>
#include <vector>

#include "deviascope/core/random.h"
#include "deviascope/sky/frame.h"
#include "deviascope/sky/healpix_map.h"
#include "deviascope/sky/pixelisation.h"
#include "hard_directions.h"
#include "python_check.h"
#include "temporary_folder.h"

using namespace deviascope;
using namespace deviascope::test;

namespace {

const std::filesystem::path scripts =
    std::filesystem::path(DEVIASCOPE_TEST_DATA) / "reference" / "sky";

void check_python(const std::string& script, const std::vector<std::string>& arguments) {
    const PythonResult result = run_python(scripts / script, arguments);
    INFO(result.output);
    CHECK(result.exit_code == 0);
}

template <class Value>
void write_raw(const std::filesystem::path& path, const std::vector<Value>& values) {
    std::ofstream file(path, std::ios::binary);
    file.write(reinterpret_cast<const char*>(values.data()),
               std::streamsize(values.size() * sizeof(Value)));
}

std::vector<double> read_raw(const std::filesystem::path& path) {
    std::vector<double> values(std::filesystem::file_size(path) / sizeof(double));
    std::ifstream file(path, std::ios::binary);
    file.read(reinterpret_cast<char*>(values.data()),
              std::streamsize(values.size() * sizeof(double)));
    return values;
}

/// The same bits, with any NaN equal to any NaN.
bool same_values(const std::vector<double>& a, const std::vector<double>& b) {
    return std::equal(a.begin(), a.end(), b.begin(), b.end(), [](double p, double q) {
        return (std::isnan(p) && std::isnan(q)) ||
               std::bit_cast<std::uint64_t>(p) == std::bit_cast<std::uint64_t>(q);
    });
}

}  // namespace

TEST_CASE("pixel numbers are healpy's on random and hard directions", "[sky]") {
    const std::vector<Direction> directions = hard_directions(105, 200000);
    TemporaryFolder folder;
    write_raw(folder / "directions", directions);
    std::vector<std::string> arguments{folder.path().string()};
    for (const int nside : {1, 2, 8, 64, 1024, 8192}) {
        const Pixelisation grid(nside);
        std::vector<std::int64_t> pixels(directions.size());
        grid.pixels_at(directions, pixels);
        std::vector<std::int64_t> nested;
        std::vector<Direction> centres;
        for (const std::int64_t pixel : pixels) {
            nested.push_back(grid.nested_of_ring(pixel));
            centres.push_back(grid.centre(pixel));
        }
        const std::string suffix = std::to_string(nside);
        write_raw(folder / ("pixels-" + suffix), pixels);
        write_raw(folder / ("nested-" + suffix), nested);
        write_raw(folder / ("centres-" + suffix), centres);
        arguments.push_back(suffix);
    }
    check_python("pixels.py", arguments);
}

TEST_CASE("frames are pyerfa's on random directions", "[sky]") {
    const std::vector<Direction> icrs = hard_directions(106, 50000);
    TemporaryFolder folder;
    for (const Frame frame : {Frame::icrs, Frame::galactic, Frame::ecliptic}) {
        std::vector<Direction> rotated;
        for (const Direction& d : icrs)
            rotated.push_back((rotation(Frame::icrs, frame) * d).eval());
        write_raw(folder / name_of(frame), rotated);
    }
    check_python("frames.py", {folder.path().string()});
}

TEST_CASE("maps written by healpy and astropy in many forms read bit for bit", "[sky]") {
    TemporaryFolder folder;
    check_python("write_maps.py", {folder.path().string()});
    std::ifstream list(folder / "list");
    std::string name, frame;
    int nside = 0;
    int n_maps = 0;
    while (list >> name >> nside >> frame) {
        INFO(name);
        const HealpixMap map = read_healpix_map(folder / (name + ".fits"));
        CHECK(map.nside == nside);
        CHECK((map.frame ? name_of(*map.frame) : "none") == frame);
        CHECK(same_values(map.value, read_raw(folder / (name + ".values"))));
        ++n_maps;
    }
    CHECK(n_maps == 51);
}

TEST_CASE("maps of ours are read by healpy bit for bit", "[sky]") {
    TemporaryFolder folder;
    for (const int nside : {2, 64}) {
        const Frame frame = nside == 2 ? Frame::icrs : Frame::galactic;
        HealpixMap map{nside, frame, {}};
        Stream stream(107, Purpose::test, std::uint64_t(nside), 0, 0);
        for (std::int64_t pixel = 0; pixel < Pixelisation(nside).n_pixels(); ++pixel)
            map.value.push_back(normal(stream));
        map.value[17] = std::numeric_limits<double>::quiet_NaN();
        write_healpix_map(folder / "map.fits", map, "EXPOSURE", "1");
        write_raw(folder / "values", map.value);
        check_python("read_map.py",
                     {(folder / "map.fits").string(),
                      (folder / "values").string(),
                      std::to_string(nside),
                      nside == 2 ? "C" : "G"});
    }
}
