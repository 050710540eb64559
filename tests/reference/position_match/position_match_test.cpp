// SPDX-License-Identifier: GPL-2.0-or-later
// Matching of positions against a k-d tree of SciPy.
#include <catch2/catch.hpp>
#include <cmath>
#include <fstream>
#include <sstream>

#include "deviascope/core/random.h"
#include "deviascope/sky/position_match.h"
#include "python_check.h"
#include "temporary_folder.h"

using namespace deviascope;
namespace fs = std::filesystem;

namespace {

constexpr std::uint64_t seed = 20261202;

/// Anywhere, crowded about the poles or about longitude 0, in equal parts.
Direction crowded(Stream& stream) {
    const double kind = std::floor(3.0 * uniform(stream));
    const double a = uniform(stream), b = uniform(stream);
    if (kind == 0) return direction_of(360.0 * a, std::asin(2.0 * b - 1.0) * 180.0 / M_PI);
    const double spread = 0.02;  // degrees: several radii
    if (kind == 1)
        return direction_of(360.0 * a, (b < 0.5 ? 90.0 : -90.0) * (1 - spread * b / 90));
    return direction_of(spread * (a - 0.5), 180.0 * b - 90.0);
}

std::vector<Direction> positions(std::size_t n, std::uint64_t which) {
    std::vector<Direction> made;
    for (std::size_t i = 0; i < n; ++i) {
        Stream stream(seed, Purpose::test, which, i, 0);
        made.push_back(crowded(stream).normalized());
    }
    return made;
}

/// Copies of some positions, moved by 0 to 2 radii.
void add_counterparts(const std::vector<Direction>& first,
                      double radius,
                      std::vector<Direction>& second) {
    for (std::size_t i = 0; i < first.size(); i += 3) {
        Stream stream(seed, Purpose::test, 9, i, 0);
        const double reach = 2.0 * radius * uniform(stream);
        Eigen::Vector3d step;
        for (double& one : step) one = normal(stream);
        const Direction across = (step - step.dot(first[i]) * first[i]).normalized();
        second.push_back(std::cos(reach) * first[i] + std::sin(reach) * across);
    }
}

void write(const fs::path& path, const std::vector<Direction>& list) {
    std::ofstream file(path, std::ios::binary);
    file.write(reinterpret_cast<const char*>(list.data()),
               static_cast<std::streamsize>(list.size() * sizeof(Direction)));
}

}  // namespace

TEST_CASE("matches are those of a k-d tree, at poles and at longitude 0 too", "[sky]") {
    for (const double arcsec : {0.5, 5.0, 60.0, 3600.0}) {
        const double radius = arcsec * radians_per_arcsec;
        const std::vector<Direction> first = positions(20000, 1);
        std::vector<Direction> second = positions(20000, 2);
        add_counterparts(first, radius, second);
        const test::TemporaryFolder folder;
        write(folder.path() / "first", first);
        write(folder.path() / "second", second);
        std::ostringstream text;
        text.precision(17);
        text << radius;
        const auto result = test::run_python(
            fs::path(DEVIASCOPE_TEST_DATA) / "reference/position_match/match.py",
            {folder.path() / "first", folder.path() / "second", text.str()});
        REQUIRE(result.exit_code == 0);
        std::istringstream expected(result.output);
        const PositionIndex index(first, radius);
        std::int64_t matches = 0;
        for (std::size_t i = 0; i < second.size(); ++i) {
            int near = -1;
            expected >> near;
            INFO(arcsec << " arcsec, position " << i);
            REQUIRE(index.has_neighbour(second[i]) == (near == 1));
            matches += near;
        }
        CHECK(matches > 3000);
        CHECK(index.matches_of(PositionIndex(second, radius)) == matches);
    }
}
