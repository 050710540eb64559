// SPDX-License-Identifier: GPL-2.0-or-later
#include "core/h5/whole_chunks.h"

#include <H5Cpp.h>

#include <catch2/catch.hpp>
#include <random>
#include <string>
#include <vector>

#include "core/h5/fletcher32.h"
#include "core/h5/reader.h"
#include "core/h5/replaced_file.h"
#include "core/h5/writer.h"
#include "deviascope/core/error.h"
#include "file_bytes.h"
#include "ramp.h"
#include "temporary_folder.h"

using namespace deviascope;
using h5::Shape;
using h5::Writer;
using test::ramp;
using test::same_bits;
using test::TemporaryFolder;

namespace {

namespace fs = std::filesystem;

/// Word by word, as the sums are defined.
std::uint32_t plain_fletcher32(const std::string& bytes) {
    std::uint64_t first = 0, second = 0;
    for (std::size_t at = 0; at < bytes.size(); at += 2) {
        first += static_cast<unsigned char>(bytes[at]) * 256U +
                 static_cast<unsigned char>(bytes[at + 1]);
        if (first > 65535) first -= 65535;
        second += first;
        if (second > 65535) second -= 65535;
    }
    return static_cast<std::uint32_t>(second << 16U | first);
}

std::string random_bytes(std::size_t n_bytes, std::mt19937_64& random) {
    std::string bytes(n_bytes, '\0');
    for (char& byte : bytes) byte = static_cast<char>(random());
    return bytes;
}

/// A chunk as it lies in the file, and which filters it was spared.
struct RawChunk {
    std::vector<char> bytes;
    std::uint32_t spared = 0;
    bool operator==(const RawChunk&) const = default;
};

RawChunk raw_chunk(const H5::DataSet& set, const std::vector<hsize_t>& offset) {
    hsize_t n_bytes = 0;
    REQUIRE(H5Dget_chunk_storage_size(set.getId(), offset.data(), &n_bytes) >= 0);
    RawChunk chunk{std::vector<char>(n_bytes), 0};
    REQUIRE(H5Dread_chunk(
                set.getId(), H5P_DEFAULT, offset.data(), &chunk.spared, chunk.bytes.data()) >=
            0);
    return chunk;
}

const h5::About about{"numbers", "1", "row x part x column"};

}  // namespace

TEST_CASE("the checksum in lanes is the checksum word by word", "[core]") {
    CHECK(h5::fletcher32({}) == 0);
    std::mt19937_64 random(20261202);
    // About the words of a round (16), of all rounds of a turn (5760), and between.
    for (const std::size_t n_words :
         {1, 2, 15, 16, 17, 31, 5759, 5760, 5761, 5775, 5776, 5777, 11520, 98304, 100001}) {
        CAPTURE(n_words);
        std::string bytes = random_bytes(2 * n_words, random);
        CHECK(h5::fletcher32(bytes) == plain_fletcher32(bytes));
        // Sums that are 0 modulo 65535 but not 0, and the largest there are.
        bytes.assign(bytes.size(), '\xff');
        CHECK(h5::fletcher32(bytes) == plain_fletcher32(bytes));
        bytes.assign(bytes.size(), '\0');
        CHECK(h5::fletcher32(bytes) == 0);
        bytes.back() = 1;
        CHECK(h5::fletcher32(bytes) == plain_fletcher32(bytes));
    }
    CHECK_THROWS_AS(h5::fletcher32(std::string(3, 'x')), InternalError);
}

TEST_CASE("chunks stored whole are the chunks that the HDF5 library stores, bit for bit",
          "[core]") {
    const TemporaryFolder folder;
    const fs::path path = folder / "file.h5";
    // Chunks that fit, and chunks that reach beyond both other axes.
    for (const Shape& chunk : {Shape{4, 1, 5}, Shape{4, 2, 3}, Shape{1, 3, 10}}) {
        const std::size_t per_row = 3 * 10, n_rows = 24;
        const std::vector<double> values = ramp(n_rows * per_row);
        const std::span<const double> all(values);
        h5::write_file(path, [&](Writer& writer) {
            for (const char* name : {"/whole", "/row_by_row"})
                writer.growing_reals(name, about, {3, 10}, chunk, Writer::Packing::plain);
            writer.append("/whole", all.first(8 * per_row));
            writer.append("/whole", all.subspan(8 * per_row));
        });
        // The library's own way.
        {
            const H5::H5File file(path.string(), H5F_ACC_RDWR);
            const H5::DataSet set = file.openDataSet("/row_by_row");
            const hsize_t extent[] = {n_rows, 3, 10};
            set.extend(extent);
            set.write(values.data(), H5::PredType::NATIVE_DOUBLE);
        }
        CHECK(same_bits(h5::Reader(path).reals("/whole", {n_rows, 3, 10}), values));
        const H5::H5File file(path.string(), H5F_ACC_RDONLY);
        const H5::DataSet whole = file.openDataSet("/whole");
        const H5::DataSet expected = file.openDataSet("/row_by_row");
        for (hsize_t row = 0; row < n_rows; row += chunk[0])
            for (hsize_t part = 0; part < 3; part += chunk[1])
                for (hsize_t column = 0; column < 10; column += chunk[2]) {
                    const std::vector<hsize_t> offset{row, part, column};
                    CHECK(raw_chunk(whole, offset) == raw_chunk(expected, offset));
                }
    }
}

TEST_CASE("what does not fill chunks, or is packed, is left to the library", "[core]") {
    const TemporaryFolder folder;
    const fs::path path = folder / "file.h5";
    h5::write_file(path, [](Writer& writer) {
        writer.growing_reals("/plain", about, {3}, {4, 3}, Writer::Packing::plain);
        writer.growing_reals("/packed", about, {3}, {4, 3}, Writer::Packing::deflated);
        writer.dataset("/naturals", about, {1}, std::vector<std::uint32_t>{1});
    });
    const std::vector<double> values = ramp(24);
    const auto* bytes = reinterpret_cast<const char*>(values.data());
    const H5::H5File file(path.string(), H5F_ACC_RDWR);
    const H5::DataSet plain = file.openDataSet("/plain");
    const hsize_t extent[] = {12, 3};
    plain.extend(extent);
    CHECK_FALSE(h5::write_whole_chunks(plain, {0, {3, 3}, bytes}));
    CHECK_FALSE(h5::write_whole_chunks(plain, {2, {4, 3}, bytes}));
    CHECK(h5::write_whole_chunks(plain, {4, {8, 3}, bytes}));
    const H5::DataSet packed = file.openDataSet("/packed");
    packed.extend(extent);
    CHECK_FALSE(h5::write_whole_chunks(packed, {0, {4, 3}, bytes}));
    CHECK_FALSE(h5::write_whole_chunks(file.openDataSet("/naturals"), {0, {1}, bytes}));
}
