// SPDX-License-Identifier: GPL-2.0-or-later
#include <catch2/catch.hpp>
#include <cmath>
#include <sstream>

#include "core/gzip/byte_source.h"
#include "deviascope/chain/export_draws.h"
#include "deviascope/core/error.h"
#include "example_chain.h"
#include "file_bytes.h"
#include "temporary_folder.h"

using namespace deviascope;
using deviascope::test::TemporaryFolder;

namespace {

Chain example() {
    Chain chain;
    chain.provenance = test::example_provenance();
    chain.parameters = test::example_parameters();
    chain.vectors = test::example_vectors();
    chain.counts = test::example_counts();
    chain.draws = test::example_draws(0, 5);
    chain.warm_up = test::example_warm_up();
    return chain;
}

std::vector<std::vector<std::string>> cells_of(const std::string& text) {
    std::vector<std::vector<std::string>> rows;
    std::istringstream lines(text);
    for (std::string line; std::getline(lines, line);) {
        rows.emplace_back();
        std::istringstream cells(line);
        for (std::string cell; std::getline(cells, cell, ',');) rows.back().push_back(cell);
    }
    return rows;
}

std::string unpacked(const std::filesystem::path& path) {
    ByteSource source(path);
    std::string text(1 << 20, '\0');
    text.resize(source.read(text));
    return text;
}

}  // namespace

TEST_CASE("exported draws have all digits, amplitudes and directions", "[chain]") {
    const TemporaryFolder folder;
    const Chain chain = example();
    REQUIRE(export_draws(chain, folder / "draws.csv", 1) == 40);
    const auto rows = cells_of(test::bytes_of(folder / "draws.csv"));
    REQUIRE(rows.size() == 41);
    CHECK(rows[0].size() == export_columns(chain).size());
    // Row 2, replicate 1, walker 3 (from 0): see example_draws.
    const auto& row = rows[1 + (2 * 2 + 1) * 4 + 3];
    CHECK(row[0] == "201");  // 192 + 3 x 3
    CHECK(row[1] == "2");
    CHECK(row[2] == "4");
    for (std::size_t parameter = 0; parameter < 7; ++parameter)
        CHECK(std::stod(row[5 + parameter]) == (2130.0 + double(parameter)) / 8.0);
    const auto column = [&](const std::string& name) {
        for (std::size_t at = 0; at < rows[0].size(); ++at)
            if (rows[0][at] == name) return std::stod(row[at]);
        FAIL("no column " << name);
        return 0.0;
    };
    const double x = column("velocity.x"), y = column("velocity.y"), z = column("velocity.z");
    CHECK(column("velocity.amplitude") == Approx(std::sqrt(x * x + y * y + z * z)));
    CHECK(column("velocity.speed_km_s") ==
          Approx(299792.458 * std::sqrt(x * x + y * y + z * z)));
    const Eigen::Vector3d icrs =
        rotation(Frame::ecliptic, Frame::icrs) * Eigen::Vector3d(x, y, z);
    CHECK(column("velocity.ra_deg") == Approx(lon_lat_of(icrs).lon_deg));
    CHECK(column("velocity.dec_deg") == Approx(lon_lat_of(icrs).lat_deg));
}

TEST_CASE("exports are thinned by whole rows, and packed to the same bytes", "[chain]") {
    const TemporaryFolder folder;
    const Chain chain = example();
    CHECK(export_draws(chain, folder / "draws.csv", 2) == 24);
    CHECK(export_draws(chain, folder / "draws.csv.gz", 2) == 24);
    CHECK(unpacked(folder / "draws.csv.gz") == test::bytes_of(folder / "draws.csv"));
    const std::string packed = test::bytes_of(folder / "draws.csv.gz");
    export_draws(chain, folder / "draws.csv.gz", 2);
    CHECK(test::bytes_of(folder / "draws.csv.gz") == packed);
    CHECK_THROWS_AS(export_draws(chain, folder / "draws.txt", 1), UsageError);
    CHECK_THROWS_AS(export_draws(chain, folder / "nowhere" / "draws.csv", 1), OutputError);
}
