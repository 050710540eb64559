// SPDX-License-Identifier: GPL-2.0-or-later
#include "core/h5/whole_chunks.h"

#include <H5Cpp.h>
#include <fcntl.h>

#include <algorithm>
#include <catch2/catch.hpp>
#include <cstdint>
#include <random>
#include <string>
#include <vector>

#include "core/descriptor.h"
#include "core/h5/draft_file.h"
#include "core/h5/exchanged_file.h"
#include "core/h5/fletcher32.h"
#include "core/h5/pages.h"
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

/// Not by our own writer.
void store_by_the_library(const fs::path& path,
                          const std::string& name,
                          const Shape& shape,
                          const std::vector<double>& values) {
    const H5::H5File file(path.string(), H5F_ACC_RDWR);
    const H5::DataSet set = file.openDataSet(name);
    set.extend(std::vector<hsize_t>(shape.begin(), shape.end()).data());
    set.write(values.data(), H5::PredType::NATIVE_DOUBLE);
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
    struct Case {
        Shape entry, chunk;
    };
    // Chunks that fit, and chunks that reach beyond both other axes; small ones, which are
    // copied into pages, and large ones, which become pages.
    const std::vector<Case> cases{{{3, 10}, {4, 1, 5}},
                                  {{3, 10}, {4, 2, 3}},
                                  {{3, 10}, {1, 3, 10}},
                                  {{3, 700}, {12, 1, 700}},
                                  {{3, 1024}, {8, 1, 1024}},
                                  {{3, 900}, {12, 2, 601}}};
    for (const Case& one : cases) {
        const Shape &entry = one.entry, &chunk = one.chunk;
        const std::size_t per_row = entry[0] * entry[1], n_rows = 48;
        const std::vector<double> values = ramp(n_rows * per_row);
        const std::span<const double> all(values);
        h5::write_file(path, [&](Writer& writer) {
            for (const char* name : {"/whole", "/row_by_row"})
                writer.growing_reals(name, about, entry, chunk, Writer::Packing::plain);
        });
        h5::ExchangedFile file(path);
        for (const std::size_t first : {0U, 24U})
            file.change([&](Writer& writer) {
                writer.append("/whole", all.subspan(first * per_row, 24 * per_row));
            });
        CHECK(
            same_bits(h5::Reader(path).reals("/whole", {n_rows, entry[0], entry[1]}), values));
        store_by_the_library(path, "/row_by_row", {n_rows, entry[0], entry[1]}, values);
        const H5::H5File opened(path.string(), H5F_ACC_RDONLY);
        const H5::DataSet whole = opened.openDataSet("/whole");
        const H5::DataSet expected = opened.openDataSet("/row_by_row");
        for (hsize_t row = 0; row < n_rows; row += chunk[0])
            for (hsize_t part = 0; part < entry[0]; part += chunk[1])
                for (hsize_t column = 0; column < entry[1]; column += chunk[2]) {
                    const std::vector<hsize_t> offset{row, part, column};
                    CHECK(raw_chunk(whole, offset) == raw_chunk(expected, offset));
                }
    }
}

TEST_CASE("large chunks begin at a page, and memory that is used again leaves no trace",
          "[core]") {
    const TemporaryFolder folder;
    const fs::path path = folder / "file.h5", other = folder / "other.h5";
    const std::size_t n_rows = 12, per_row = 700;
    const std::vector<double> values = ramp(5 * n_rows * per_row);
    for (const fs::path& made : {path, other})
        h5::write_file(made, [&](Writer& writer) {
            writer.growing_reals(
                "/set", about, {per_row}, {n_rows, per_row}, Writer::Packing::plain);
        });
    h5::ExchangedFile kept(path);
    for (std::size_t block = 0; block < 5; ++block) {
        const h5::Edit append = [&](Writer& writer) {
            writer.append(
                "/set", std::span(values).subspan(block * n_rows * per_row, n_rows * per_row));
        };
        kept.change(append);
        h5::ExchangedFile(other).change(append);
        CHECK(test::bytes_of(path) == test::bytes_of(other));
    }
    const H5::H5File file(path.string(), H5F_ACC_RDONLY);
    const H5::DataSet set = file.openDataSet("/set");
    const H5::DataSpace space = set.getSpace();
    hsize_t n_chunks = 0;
    REQUIRE(H5Dget_num_chunks(set.getId(), space.getId(), &n_chunks) >= 0);
    CHECK(n_chunks == 5);
    for (hsize_t chunk = 0; chunk < n_chunks; ++chunk) {
        haddr_t address = 0;
        hsize_t n_bytes = 0;
        unsigned spared = 0;
        std::vector<hsize_t> offset(2);
        REQUIRE(H5Dget_chunk_info(set.getId(),
                                  space.getId(),
                                  chunk,
                                  offset.data(),
                                  &spared,
                                  &address,
                                  &n_bytes) >= 0);
        CHECK(address % h5::page_bytes == 0);
        CHECK(n_bytes == n_rows * per_row * 8 + 4);
    }
}

TEST_CASE("reserved memory becomes pages once, where there are none", "[core]") {
    h5::Pages pages;
    char* const single = pages.add(7);
    char* const reserved = pages.reserve(3);
    CHECK(pages.reserve(2) == reserved);
    char* const next = pages.add(100);
    CHECK((next >= reserved + 3 * h5::page_bytes || next + h5::page_bytes <= reserved));
    CHECK_FALSE(pages.adopt(reserved, 5, 3));  // 7 is there
    CHECK_FALSE(pages.adopt(reserved, 7, 1));
    CHECK_FALSE(pages.adopt(single, 20, 1));
    CHECK_FALSE(pages.adopt(reserved, 20, 4));
    CHECK(pages.find(6) == nullptr);
    REQUIRE(pages.adopt(reserved, 4, 3));
    CHECK(pages.find(3) == nullptr);
    for (std::uint64_t page : {0, 1, 2})
        CHECK(pages.find(4 + page) == reserved + page * h5::page_bytes);
    CHECK(pages.find(7) == single);
    CHECK(pages.find(8) == nullptr);
    CHECK_FALSE(pages.adopt(reserved, 30, 3));
    // Memory is in one piece also where a slab has less room left.
    for (std::size_t n_taken = 5; n_taken < 3 * h5::pages_together; n_taken += 700) {
        char* const more = pages.reserve(700);
        REQUIRE(pages.adopt(more, 1000 + 2 * n_taken, 700));
        std::fill_n(more, 700 * h5::page_bytes, 'x');
    }
    CHECK_THROWS_AS(pages.reserve(h5::pages_together + 1), InternalError);
    pages.clear();
    CHECK(pages.find(7) == nullptr);
    CHECK(pages.add(1) == single);
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
    const Descriptor base(path, O_RDONLY);
    h5::DraftFile draft(&base);
    const H5::DataSet plain = draft.file().openDataSet("/plain");
    const hsize_t extent[] = {12, 3};
    plain.extend(extent);
    const auto writes = [&](const H5::DataSet& set, std::size_t first, const Shape& shape) {
        return h5::write_whole_chunks(set, {first, shape, bytes}, draft);
    };
    CHECK_FALSE(writes(plain, 0, {3, 3}));
    CHECK_FALSE(writes(plain, 2, {4, 3}));
    CHECK(writes(plain, 4, {8, 3}));
    const H5::DataSet packed = draft.file().openDataSet("/packed");
    packed.extend(extent);
    CHECK_FALSE(writes(packed, 0, {4, 3}));
    CHECK_FALSE(writes(draft.file().openDataSet("/naturals"), 0, {1}));
}
