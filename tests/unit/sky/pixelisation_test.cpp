// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/sky/pixelisation.h"

#include <catch2/catch.hpp>
#include <cmath>
#include <cstdint>
#include <numbers>
#include <set>
#include <vector>

#include "deviascope/core/error.h"
#include "deviascope/core/random.h"
#include "hard_directions.h"
#include "sky/pixel_search.h"

using namespace deviascope;

namespace {

constexpr double pi = std::numbers::pi;

Direction from_colatitude(double colatitude, double phi) {
    return {std::sin(colatitude) * std::cos(phi),
            std::sin(colatitude) * std::sin(phi),
            std::cos(colatitude)};
}

/// RING pixel centre by the formulas of Gorski et al. 2005, ApJ 622, 759, equations 2 to 9,
/// with s = 1 where i - nside is even and 2 where it is odd (the library's convention).
Direction published_centre(int nside, std::int64_t pixel) {
    const std::int64_t n_pixels = 12LL * nside * nside;
    const std::int64_t in_cap = 2LL * nside * (nside - 1);
    double z = 0.0;
    double phi = 0.0;
    if (pixel >= n_pixels - in_cap) {
        const Direction mirrored = published_centre(nside, n_pixels - 1 - pixel);
        return {mirrored.x(), -mirrored.y(), -mirrored.z()};
    }
    if (pixel < in_cap) {
        const double half = double(pixel + 1) / 2.0;
        const auto i =
            std::int64_t(std::floor(std::sqrt(half - std::sqrt(std::floor(half))))) + 1;
        const std::int64_t j = pixel + 1 - 2 * i * (i - 1);
        z = 1.0 - double(i * i) / (3.0 * nside * nside);
        phi = pi / (2.0 * double(i)) * (double(j) - 0.5);
    } else {
        const std::int64_t in_belt = pixel - in_cap;
        const std::int64_t i = in_belt / (4 * nside) + nside;
        const std::int64_t j = in_belt % (4 * nside) + 1;
        const double s = (i - nside) % 2 == 0 ? 1.0 : 2.0;
        z = 4.0 / 3.0 - 2.0 * double(i) / (3.0 * nside);
        phi = pi / (2.0 * nside) * (double(j) - s / 2.0);
    }
    const double across = std::sqrt((1.0 - z) * (1.0 + z));
    return {across * std::cos(phi), across * std::sin(phi), z};
}

}  // namespace

TEST_CASE("nside is a power of two from 1 to 8192", "[sky]") {
    for (const int nside : {1, 2, 64, 1024, 8192}) CHECK(Pixelisation::is_valid_nside(nside));
    for (const std::int64_t nside : {std::int64_t(0),
                                     std::int64_t(-1),
                                     std::int64_t(3),
                                     std::int64_t(16384),
                                     std::int64_t(1) << 40}) {
        CHECK_FALSE(Pixelisation::is_valid_nside(nside));
    }
    CHECK_THROWS_AS(Pixelisation(0), InternalError);
    CHECK_THROWS_AS(Pixelisation(-4), InternalError);
    CHECK_THROWS_AS(Pixelisation(48), InternalError);
}

TEST_CASE("number and area of pixels follow the published table", "[sky]") {
    // Npix = 12 nside^2, area = pi/(3 nside^2): Gorski et al. 2005. Figures: healpy 1.16.1
    // (nside2npix, nside2pixarea, nside2resol).
    struct Row {
        int nside;
        std::int64_t n_pixels;
        double area_sr, area_deg2, resolution_arcmin;
    };
    const Row rows[] = {{1, 12, 1.047197551196598, 3437.746770784939, 3517.938085701},
                        {2, 48, 0.2617993877991494, 859.436692696235, 1758.969042851},
                        {8, 768, 1.636246173744684e-02, 53.714793293515, 439.742260713},
                        {64, 49152, 2.556634646476068e-04, 0.839293645211, 54.967782589},
                        {1024, 12582912, 9.986854087797142e-07, 0.003278490802, 3.435486412}};
    for (const Row& row : rows) {
        const Pixelisation grid(row.nside);
        const double per_deg2 = (180.0 / pi) * (180.0 / pi);
        CHECK(grid.nside() == row.nside);
        CHECK(grid.n_pixels() == row.n_pixels);
        CHECK(grid.solid_angle() == Approx(row.area_sr).epsilon(1e-15));
        CHECK(grid.solid_angle() * per_deg2 ==
              Approx(row.area_deg2).margin(6e-13 * row.area_deg2 + 5e-13));
        CHECK(std::sqrt(grid.solid_angle() * per_deg2) * 60.0 ==
              Approx(row.resolution_arcmin).margin(6e-10));
    }
}

TEST_CASE("pixel centres follow the published formulas", "[sky]") {
    for (const int nside : {1, 2, 4, 8, 16}) {
        const Pixelisation grid(nside);
        const auto centres = grid.centres();
        for (std::int64_t pixel = 0; pixel < grid.n_pixels(); ++pixel) {
            INFO("nside " << nside << " pixel " << pixel);
            const Direction& centre = centres[std::size_t(pixel)];
            REQUIRE(centre == grid.centre(pixel));
            REQUIRE((centre - published_centre(nside, pixel)).norm() < 2e-15);
        }
    }
    // healpy 1.16.1, pix2vec(64, 12345).
    const Direction expected(-0.137575187725154, -0.855028109317108, 0.5);
    CHECK((Pixelisation(64).centre(12345) - expected).norm() < 1e-15);
    CHECK(Pixelisation(64).centre(12345).z() == 0.5);
}

TEST_CASE("every pixel of every nside up to 64 returns to itself through its centre", "[sky]") {
    for (int nside = 1; nside <= 64; nside *= 2) {
        const Pixelisation grid(nside);
        const auto centres = grid.centres();
        std::vector<std::int64_t> pixels(centres.size());
        grid.pixels_at(centres, pixels);
        std::set<std::int64_t> nested;
        for (std::int64_t pixel = 0; pixel < grid.n_pixels(); ++pixel) {
            REQUIRE(pixels[std::size_t(pixel)] == pixel);
            REQUIRE(grid.pixel_at(centres[std::size_t(pixel)]) == pixel);
            REQUIRE(grid.ring_of_nested(grid.nested_of_ring(pixel)) == pixel);
            nested.insert(grid.nested_of_ring(pixel));
        }
        REQUIRE(std::int64_t(nested.size()) == grid.n_pixels());
    }
}

TEST_CASE("points fall in the pixels of the published table", "[sky]") {
    // healpy 1.16.1, ang2pix; RING and NESTED. Rows whose answer holds under changes of 1e-7
    // deg.
    struct Cell {
        int nside;
        std::int64_t ring, nested;
    };
    struct Row {
        double lon, lat;
        Cell cells[5];
    };
    const Row rows[] = {
        {264.021,
         48.253,
         {{1, 2, 2}, {2, 9, 9}, {8, 104, 151}, {64, 6324, 9690}, {1024, 1599306, 2480818}}},
        {96.337272,
         -60.188553,
         {{1, 9, 9},
          {2, 38, 38},
          {8, 713, 608},
          {64, 45914, 38950},
          {1024, 11750262, 9971323}}},
        {180,
         41,
         {{1, 6, 6}, {2, 16, 27}, {8, 160, 447}, {64, 8448, 28671}, {1024, 2166784, 7339839}}},
        {359.9,
         -41.9,
         {{1, 11, 11},
          {2, 43, 45},
          {8, 655, 725},
          {64, 41087, 46421},
          {1024, 10491898, 11883859}}},
        {123.4,
         30,
         {{1, 1, 1}, {2, 6, 6}, {8, 186, 97}, {64, 12247, 6229}, {1024, 3145084, 1594714}}}};
    for (const Row& row : rows) {
        for (const Cell& cell : row.cells) {
            INFO(row.lon << " " << row.lat << " nside " << cell.nside);
            const Pixelisation grid(cell.nside);
            CHECK(grid.pixel_at(direction_of(row.lon, row.lat)) == cell.ring);
            CHECK(grid.nested_of_ring(cell.ring) == cell.nested);
            CHECK(grid.ring_of_nested(cell.nested) == cell.ring);
        }
    }
    CHECK(Pixelisation(1).pixel_at(direction_of(0, 0)) == 4);
}

TEST_CASE("the poles fall in the first and the last ring", "[sky]") {
    for (const int nside : {1, 2, 8, 64, 1024, 8192}) {
        const Pixelisation grid(nside);
        CHECK(grid.pixel_at({0, 0, 1}) < 4);
        CHECK(grid.pixel_at({0, 0, -1}) >= grid.n_pixels() - 4);
        for (const double tiny : {0.0, -0.0, 1e-17, -1e-17, 1e-300, -1e-300}) {
            CHECK(grid.pixel_at({tiny, -tiny, 1}) < 4);
            CHECK(grid.pixel_at({tiny, tiny, -1}) >= grid.n_pixels() - 4);
            CHECK(grid.pixel_at({1, tiny, tiny}) >= 0);
            CHECK(grid.pixel_at({1, tiny, tiny}) < grid.n_pixels());
        }
    }
}

TEST_CASE("pixels of many directions are those of one at a time", "[sky]") {
    // One at a time is the HEALPix library itself; the places where a pixel ends are hit on
    // purpose, moved by 1e-18 to 1e-3.
    const std::vector<Direction> directions = test::hard_directions(108, 30011);
    std::vector<std::int64_t> pixels(directions.size());
    for (int nside = 1; nside <= Pixelisation::max_nside; nside *= 2) {
        const Pixelisation grid(nside);
        grid.pixels_at(directions, pixels);
        for (std::size_t at = 0; at < directions.size(); ++at) {
            if (pixels[at] == grid.pixel_at(directions[at])) continue;
            INFO("nside " << nside << " at " << directions[at].transpose());
            REQUIRE(pixels[at] == grid.pixel_at(directions[at]));
        }
    }
}

TEST_CASE("the search of many directions rarely has to ask again", "[sky]") {
    // What is asked again lies within 1e-9 nside of one of four lines: 8e-9 nside of the sky.
    Stream stream(109, Purpose::test, 0, 0, 0);
    std::size_t n_again = 0;
    for (int round = 0; round < 400; ++round) {
        SearchBlock block;
        block.n = SearchBlock::capacity;
        for (std::size_t lane = 0; lane < block.n; ++lane) {
            Eigen::Vector3d v;
            for (double& component : v) component = normal(stream);
            v.normalize();
            block.x[lane] = v.x();
            block.y[lane] = v.y();
            block.z[lane] = v.z();
        }
        search(block, 1024);
        for (const double edge : block.edge) n_again += !(edge < search_limit(1024));
    }
    CHECK(n_again <= 8);  // 0.84 expected of 102,400: Poisson chance of more than 8 is 1e-7
}

TEST_CASE("RING and NESTED follow the published lists", "[sky]") {
    // healpy 1.16.1: ring2nest(2, 0 … 47), and pix2ang of one number read in both orders.
    const std::int64_t nested[48] = {3,  7,  11, 15, 2,  1,  6,  5,  10, 9,  14, 13,
                                     19, 0,  23, 4,  27, 8,  31, 12, 17, 22, 21, 26,
                                     25, 30, 29, 18, 16, 35, 20, 39, 24, 43, 28, 47,
                                     34, 33, 38, 37, 42, 41, 46, 45, 32, 36, 40, 44};
    const Pixelisation grid(2);
    for (std::int64_t ring = 0; ring < 48; ++ring) {
        CHECK(grid.nested_of_ring(ring) == nested[ring]);
        CHECK(grid.ring_of_nested(nested[ring]) == ring);
    }
    struct Row {
        int nside;
        std::int64_t pixel;
        double theta_ring, phi_ring;
        std::int64_t as_nested;
        double theta_nested, phi_nested;
        std::int64_t as_ring;
    };
    const Row rows[] = {{2,
                         0,
                         0.411137862322348,
                         0.785398163397448,
                         3,
                         1.230959417340775,
                         0.785398163397448,
                         13},
                        {2,
                         13,
                         1.230959417340775,
                         0.785398163397448,
                         0,
                         0.841068670567930,
                         5.890486225480862,
                         11},
                        {64,
                         0,
                         0.012757845597671,
                         0.785398163397448,
                         4095,
                         1.560379471738919,
                         0.785398163397448,
                         24224},
                        {64,
                         12345,
                         1.047197551196598,
                         4.552854978444583,
                         32681,
                         1.445468495626831,
                         5.485515297479052,
                         21599},
                        {64,
                         24576,
                         1.570796326794897,
                         3.153864499892878,
                         26282,
                         2.286634387020008,
                         3.141592653589793,
                         40704},
                        {64,
                         49151,
                         3.128834807992122,
                         5.497787143782138,
                         45056,
                         1.581213181850874,
                         5.497787143782138,
                         24928},
                        {1024,
                         1234567,
                         0.637463536208429,
                         1.094161563511712,
                         500641,
                         1.143168352388629,
                         2.216602238494751,
                         3681701},
                        {1024,
                         12582911,
                         3.140795293626358,
                         5.497787143782138,
                         11534336,
                         1.571447368507555,
                         5.497787143782138,
                         6297088}};
    for (const Row& row : rows) {
        INFO("nside " << row.nside << " pixel " << row.pixel);
        const Pixelisation cells(row.nside);
        CHECK(cells.nested_of_ring(row.pixel) == row.as_nested);
        CHECK(cells.ring_of_nested(row.pixel) == row.as_ring);
        const Direction ring = from_colatitude(row.theta_ring, row.phi_ring);
        const Direction nest = from_colatitude(row.theta_nested, row.phi_nested);
        CHECK((cells.centre(row.pixel) - ring).norm() < 2e-15);
        CHECK((cells.centre(row.as_ring) - nest).norm() < 2e-15);
    }
}

TEST_CASE("children fill their parent and no other pixel", "[sky]") {
    const Pixelisation coarse(4);
    for (const int fine_nside : {4, 8, 32}) {
        const Pixelisation fine(fine_nside);
        std::vector<std::int64_t> owner(std::size_t(fine.n_pixels()), -1);
        for (std::int64_t pixel = 0; pixel < coarse.n_pixels(); ++pixel) {
            const auto inside = coarse.children(pixel, fine);
            REQUIRE(std::int64_t(inside.size()) == fine.n_pixels() / coarse.n_pixels());
            for (const std::int64_t child : inside) {
                REQUIRE(owner[std::size_t(child)] == -1);
                owner[std::size_t(child)] = pixel;
                REQUIRE(fine.parent(child, coarse) == pixel);
                REQUIRE(coarse.pixel_at(fine.centre(child)) == pixel);
            }
        }
    }
    CHECK(coarse.children(7, coarse) == std::vector<std::int64_t>{7});
    CHECK_THROWS_AS(Pixelisation(8).children(0, coarse), InternalError);
    CHECK_THROWS_AS(coarse.parent(0, Pixelisation(8)), InternalError);
}

TEST_CASE("wrong arguments never reach the library", "[sky]") {
    const Pixelisation grid(8);
    CHECK_THROWS_AS(grid.pixel_at({0, 0, 0}), InternalError);
    CHECK_THROWS_AS(grid.pixel_at({0, 0, 2}), InternalError);
    CHECK_THROWS_AS(grid.pixel_at({std::nan(""), 0, 1}), InternalError);
    CHECK_THROWS_AS(grid.centre(-1), InternalError);
    CHECK_THROWS_AS(grid.centre(768), InternalError);
    CHECK_THROWS_AS(grid.ring_of_nested(768), InternalError);
    CHECK_THROWS_AS(grid.nested_of_ring(-1), InternalError);
    std::vector<Direction> directions(100, Direction(0, 0, 1));
    std::vector<std::int64_t> pixels(100);
    directions[77].x() = std::nan("");
    CHECK_THROWS_AS(grid.pixels_at(directions, pixels), InternalError);
    pixels.pop_back();
    directions[77].x() = 0.0;
    CHECK_THROWS_AS(grid.pixels_at(directions, pixels), InternalError);
}
