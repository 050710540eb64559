// SPDX-License-Identifier: GPL-2.0-or-later
#include <fcntl.h>
#include <hdf5.h>

#include <algorithm>
#include <catch2/catch.hpp>
#include <limits>
#include <numeric>

#include "core/h5/draft_file.h"
#include "core/h5/identity.h"
#include "core/h5/pages.h"
#include "core/h5/reader.h"
#include "core/h5/replaced_file.h"
#include "core/h5/writer.h"
#include "file_bytes.h"
#include "full_disk.h"
#include "ramp.h"
#include "temporary_folder.h"

using namespace deviascope;
using h5::Reader;
using h5::Shape;
using h5::Writer;
using test::bytes_of;
using test::FullDisk;
using test::ramp;
using test::same_bits;
using test::TemporaryFolder;

namespace {

namespace fs = std::filesystem;

constexpr double infinite = std::numeric_limits<double>::infinity();

/// Values that a conversion would change: signed zero, subnormal, infinities, not a number.
const std::vector<double> odd{0.0,
                              -0.0,
                              5e-324,
                              -infinite,
                              std::numeric_limits<double>::quiet_NaN(),
                              1.0 / 3.0,
                              1e308,
                              -1e-300};

template <class Value>
std::span<const Value> all_of(const std::vector<Value>& values) {
    return values;
}

void fill(Writer& writer) {
    writer.group("/group", "a group");
    writer.dataset("/group/reals", {"lengths", "m", "row x column"}, {4, 2}, all_of(odd));
    const std::vector<std::int64_t> integers{std::numeric_limits<std::int64_t>::min(), -1, 0};
    writer.dataset("/group/integers", {"numbers", "1", "row"}, {3}, all_of(integers));
    const std::vector<std::uint32_t> naturals{0, 4294967295U};
    writer.dataset("/group/naturals", {"counts", "1", "row"}, {2}, all_of(naturals));
    writer.dataset("/group/texts", {"words", "", "row"}, {"", "dunlin", "Grün é\n", "tail"});
}

fs::path written(const TemporaryFolder& folder, const h5::Edit& edit) {
    h5::write_file(folder / "file.h5", edit);
    return folder / "file.h5";
}

}  // namespace

TEST_CASE("HDF5 datasets come back bit for bit", "[core]") {
    const TemporaryFolder folder;
    const Reader reader(written(folder, fill));
    CHECK(same_bits(reader.reals("/group/reals", {4, 2}), odd));
    CHECK(reader.integers("/group/integers", {3}) ==
          std::vector<std::int64_t>{std::numeric_limits<std::int64_t>::min(), -1, 0});
    CHECK(reader.naturals("/group/naturals", {2}) ==
          std::vector<std::uint32_t>{0, 4294967295U});
    CHECK(reader.texts("/group/texts", {4}) ==
          std::vector<std::string>{"", "dunlin", "Grün é\n", "tail"});
    CHECK(reader.names("/group") ==
          std::vector<std::string>{"integers", "naturals", "reals", "texts"});
    CHECK(reader.text("/group/reals", "unit") == "m");
    CHECK(reader.text("/group", "meaning") == "a group");
    CHECK(reader.find("/group/reals").kind == h5::Kind::real64);
}

TEST_CASE("HDF5 attributes can be replaced and may be absent", "[core]") {
    const TemporaryFolder folder;
    const fs::path path = written(folder, [](Writer& writer) {
        writer.attribute("/", "a", std::int64_t{-5});
        writer.attribute("/", "a", 0.1);
        writer.attribute("/", "b", std::string("x"));
        writer.attribute("/", "b", std::string(100000, 'y'));
        writer.attribute("/", "empty", std::string());
        writer.attribute("/", "n", std::numeric_limits<std::int64_t>::max());
    });
    const Reader reader(path);
    CHECK(reader.real("/", "a") == 0.1);
    CHECK(reader.text("/", "b") == std::string(100000, 'y'));
    CHECK(reader.text("/", "empty") == "");
    CHECK(reader.integer("/", "n") == std::numeric_limits<std::int64_t>::max());
    CHECK_FALSE(reader.text("/", "c").has_value());
    CHECK_THROWS_WITH(reader.integer("/", "b"), Catch::Contains("an integer is needed"));
    CHECK_THROWS_WITH(reader.required_integer("/", "c"), Catch::Contains("/@c: missing"));
}

TEST_CASE("empty HDF5 datasets are datasets", "[core]") {
    const TemporaryFolder folder;
    const fs::path path = written(folder, [](Writer& writer) {
        writer.dataset("/none", {"nothing", "1", "row x column"}, {0, 3}, all_of(ramp(0)));
        writer.dataset("/words", {"nothing", "", "row"}, std::vector<std::string>{});
    });
    const Reader reader(path);
    CHECK(reader.reals("/none", {0, 3}).empty());
    CHECK(reader.texts("/words", {0}).empty());
}

TEST_CASE("a growing HDF5 dataset keeps what it has, over many openings", "[core]") {
    const TemporaryFolder folder;
    const fs::path path = written(folder, [](Writer& writer) {
        writer.growing_reals(
            "/rows", {"rows", "1", "row x a x b x c"}, {2, 3, 5}, {7, 1, 16, 5});
        writer.growing_integers("/steps", {"steps", "1", "row"}, {}, {64});
    });
    const std::vector<double> all = ramp(30 * 47);
    std::size_t n_rows = 0;
    for (const std::size_t n_more : {1U, 0U, 6U, 7U, 33U}) {
        h5::change_file(path, [&](Writer& writer) {
            writer.append("/rows", all_of(all).subspan(30 * n_rows, 30 * n_more));
            const std::vector<std::int64_t> step{static_cast<std::int64_t>(n_more)};
            writer.append("/steps", all_of(step));
        });
        n_rows += n_more;
        const Reader reader(path);
        const std::vector<double> expected(all.begin(),
                                           all.begin() + static_cast<long>(30 * n_rows));
        CHECK(same_bits(reader.reals("/rows", {n_rows, 2, 3, 5}), expected));
        const std::vector<double> last(expected.end() - 30, expected.end());
        CHECK(same_bits(reader.last_reals("/rows", {n_rows, 2, 3, 5}), last));
    }
    CHECK(Reader(path).integers("/steps", {5}) == std::vector<std::int64_t>{1, 0, 6, 7, 33});
    CHECK(std::distance(fs::directory_iterator(folder.path()), {}) == 1);
}

TEST_CASE("changes of many pages are all kept, in a file that grows again and again",
          "[core]") {
    const TemporaryFolder folder;
    const fs::path path = written(folder, [](Writer& writer) {
        writer.growing_reals(
            "/rows", {"rows", "1", "row x column"}, {1000}, {7, 1000}, Writer::Packing::plain);
    });
    std::vector<double> all;
    h5::ExchangedFile file(path);
    for (const std::size_t n_rows : {1, 400, 3, 700, 0, 500, 20}) {
        std::vector<double> rows(n_rows * 1000);
        std::iota(rows.begin(), rows.end(), static_cast<double>(all.size()));
        all.insert(all.end(), rows.begin(), rows.end());
        file.change([&](Writer& writer) { writer.append("/rows", all_of(rows)); });
        CHECK(same_bits(Reader(path).reals("/rows", {all.size() / 1000, 1000}), all));
    }
}

TEST_CASE("pages are found by number, written in order, and their memory is used again",
          "[core]") {
    const TemporaryFolder folder;
    const Descriptor file(folder / "pages", O_RDWR | O_CREAT);
    h5::Pages pages;
    for (int round = 0; round < 2; ++round) {
        // Not in order, neighbours in more than one slab, and one beyond the end.
        std::vector<std::uint64_t> numbers(2400);
        std::iota(numbers.begin(), numbers.end(), std::uint64_t{2});
        std::rotate(numbers.begin(), numbers.begin() + 1100, numbers.end());
        numbers.push_back(2500);
        for (const std::uint64_t number : numbers) {
            CHECK(pages.find(number) == nullptr);
            std::fill_n(
                pages.add(number), h5::page_bytes, static_cast<char>(number % 97 + round));
        }
        const std::uint64_t length = 2401 * h5::page_bytes + 5;
        pages.write_to(file, length);
        CHECK(file.size() == 2402 * h5::page_bytes);
        file.resize(length);
        std::vector<char> expected(length, 0), found(length + 9);
        for (std::uint64_t at = 2 * h5::page_bytes; at < length; ++at)
            expected[at] = static_cast<char>(at / h5::page_bytes % 97 + round);
        found.resize(file.read(found, 0));
        CHECK(found == expected);
        pages.clear();
        CHECK(pages.find(2) == nullptr);
    }
    // A change may end in a hole, or make the file shorter.
    for (const std::uint64_t length : {std::uint64_t{90000000}, std::uint64_t{12}}) {
        h5::Draft draft;
        draft.length = length;
        draft.write_to(file);
        CHECK(file.size() == length);
    }
}

TEST_CASE("the same content gives the same bytes", "[core]") {
    const TemporaryFolder folder;
    h5::write_file(folder / "first.h5", fill);
    h5::write_file(folder / "second.h5", fill);
    CHECK(bytes_of(folder / "first.h5") == bytes_of(folder / "second.h5"));
}

TEST_CASE("a reader that is open keeps what it opened while the file is changed", "[core]") {
    const TemporaryFolder folder;
    const fs::path path = written(folder, fill);
    const Reader before(path);
    h5::change_file(path, [](Writer& writer) { writer.group("/new", "new"); });
    CHECK_FALSE(before.has("/new"));
    CHECK(same_bits(before.reals("/group/reals", {4, 2}), odd));
    CHECK(Reader(path).has("/new"));
}

TEST_CASE("numbers of any type of a foreign HDF5 file are read as doubles, in parts",
          "[core]") {
    const TemporaryFolder folder;
    const Reader reader(written(folder, fill));
    std::vector<double> part(2);
    reader.read("/group/integers", 1, part);
    CHECK(part == std::vector<double>{-1.0, 0.0});
    reader.read("/group/naturals", 0, part);
    CHECK(part == std::vector<double>{0.0, 4294967295.0});
    CHECK_THROWS_AS(reader.read("/group/integers", 2, part), InputError);
    CHECK_THROWS_AS(reader.read("/group/integers", 4, std::span<double>{}), InputError);
    CHECK_THROWS_WITH(reader.read("/group/texts", 0, part),
                      Catch::Contains("a dataset of integers or reals"));
}

TEST_CASE("a dataset of another rank, type or extent is refused with its path", "[core]") {
    const TemporaryFolder folder;
    const Reader reader(written(folder, fill));
    CHECK_THROWS_WITH(reader.shape("/group/reals", 1), Catch::Contains("2 axes (4 x 2)"));
    CHECK_THROWS_WITH(reader.reals("/group/reals", {2, 4}),
                      Catch::Contains("/group/reals: extents 4 x 2; 2 x 4"));
    CHECK_THROWS_WITH(reader.reals("/group/integers", {3}),
                      Catch::Contains("holds 64-bit integer; 64-bit real is needed"));
    CHECK_THROWS_WITH(reader.reals("/group/naturals", {2}),
                      Catch::Contains("holds unsigned 32-bit integer; 64-bit real is needed"));
    CHECK_THROWS_WITH(reader.texts("/group/none", {3}),
                      Catch::Contains("/group/none: missing"));
    CHECK_THROWS_AS(reader.find("/group"), InputError);
    CHECK_THROWS_AS(reader.names("/group/reals"), InputError);
    CHECK_FALSE(reader.has("/no/such/thing"));
}

TEST_CASE("values that the stored bytes cannot hold are refused before memory is taken",
          "[core]") {
    // A growing dataset that was extended but never written: 2^40 doubles in no bytes at all.
    const TemporaryFolder folder;
    const fs::path path = folder / "vast.h5";
    const hid_t file = H5Fcreate(path.c_str(), H5F_ACC_TRUNC, H5P_DEFAULT, H5P_DEFAULT);
    const hsize_t extent = hsize_t{1} << 40U, chunk = 1024;
    const hid_t space = H5Screate_simple(1, &extent, nullptr);
    const hid_t list = H5Pcreate(H5P_DATASET_CREATE);
    H5Pset_chunk(list, 1, &chunk);
    const hid_t set =
        H5Dcreate2(file, "/vast", H5T_IEEE_F64LE, space, H5P_DEFAULT, list, H5P_DEFAULT);
    H5Dclose(set), H5Pclose(list), H5Sclose(space), H5Fclose(file);
    CHECK_THROWS_WITH(Reader(path).reals("/vast", {extent}),
                      Catch::Contains("the values cannot be in the file"));
}

TEST_CASE("the most compressible values stay within the bound on what bytes can hold",
          "[core]") {
    const TemporaryFolder folder;
    const std::vector<double> ones(12 * 1024 * 1024 / 4, 1.0);
    const fs::path path = written(folder, [&](Writer& writer) {
        writer.dataset("/ones", {"ones", "1", "row"}, {ones.size()}, all_of(ones));
    });
    CHECK(Reader(path).reals("/ones", {ones.size()}) == ones);
}

TEST_CASE("files that are no HDF5 files are input errors", "[core]") {
    const TemporaryFolder folder;
    CHECK_THROWS_WITH(Reader(folder / "none.h5"), Catch::Contains("there is no such file"));
    CHECK_THROWS_WITH(Reader(folder.path()), Catch::Contains("not a regular file"));
    CHECK_THROWS_AS(Reader(folder.write("empty.h5", "")), InputError);
    CHECK_THROWS_AS(Reader(folder.write("short.h5", "\x89HDF")), InputError);
    CHECK_THROWS_WITH(Reader(folder.write("text.h5", std::string(5000, 'x'))),
                      Catch::Contains("no HDF5 file"));
}

TEST_CASE("a file says what it is, and a newer schema is refused", "[core]") {
    const TemporaryFolder folder;
    const h5::Identity ours{"lantern list", 2, "a list"};
    const fs::path path =
        written(folder, [&](Writer& writer) { write_identity(writer, ours); });
    const Reader reader(path);
    CHECK_NOTHROW(check_identity(reader, ours));
    CHECK_THROWS_WITH(check_identity(reader, {"lantern list", 1, ""}),
                      Catch::Contains("schema 2") && Catch::Contains("reads 1"));
    CHECK_THROWS_WITH(check_identity(reader, {"binnacle list", 2, ""}),
                      Catch::Contains("lantern list") && Catch::Contains("binnacle list"));
}

TEST_CASE("what cannot be written is an output error with path and reason", "[core]") {
    const TemporaryFolder folder;
    folder.write("regular", "");
    CHECK_THROWS_AS(h5::write_file(folder / "regular" / "file.h5", fill), OutputError);
    CHECK_THROWS_WITH(
        h5::write_file(folder / "none" / "file.h5", fill),
        Catch::Contains("none/file.h5") && Catch::Contains("No such file or directory"));
    CHECK_THROWS_WITH(h5::write_file(folder.path(), fill), Catch::Contains("directory"));
    CHECK_THROWS_AS(h5::change_file(folder / "absent.h5", fill), OutputError);
}

TEST_CASE("a file that somebody removes or replaces is not written on", "[core]") {
    const TemporaryFolder folder;
    const fs::path path = written(folder, fill);
    const h5::Edit edit = [](Writer& writer) {
        writer.attribute("/", "step", std::int64_t{2});
    };
    h5::ExchangedFile file(path);
    file.change(edit);
    fs::copy_file(path, folder / "copy");
    fs::rename(folder / "copy", path);
    CHECK_THROWS_WITH(file.change(edit), Catch::Contains("was removed or replaced"));
    fs::remove(path);
    CHECK_THROWS_WITH(file.change(edit), Catch::Contains("was removed or replaced"));
}

TEST_CASE("a disk that fills up leaves the old file and no other, for any free space",
          "[core]") {
    const TemporaryFolder folder;
    const std::vector<double> values = ramp(20000);
    const h5::Edit add = [&](Writer& writer) {
        writer.dataset("/more", {"more", "1", "row"}, {values.size()}, all_of(values));
    };
    const fs::path path = written(folder, fill);
    const std::string before = bytes_of(path);
    h5::write_file(folder / "whole.h5", add);
    const std::size_t whole = fs::file_size(folder / "whole.h5");
    fs::remove(folder / "whole.h5");
    for (std::size_t free = 0; free < whole; free += 997) {
        INFO("free bytes " << free);
        const FullDisk full(free);
        CHECK_THROWS_AS(h5::change_file(path, add), OutputError);
        CHECK_THROWS_WITH(h5::write_file(folder / "new.h5", add),
                          Catch::Contains("cannot be written: File too large"));
    }
    CHECK(bytes_of(path) == before);
    CHECK(std::distance(fs::directory_iterator(folder.path()), {}) == 1);
    h5::change_file(path, add);
    CHECK(same_bits(Reader(path).reals("/more", {values.size()}), values));
}

TEST_CASE("what HDF5 refuses is an output error with the object and its words", "[core]") {
    const TemporaryFolder folder;
    CHECK_THROWS_WITH(
        written(folder,
                [](Writer& writer) {
                    writer.group("/twice", "once");
                    writer.group("/twice", "again");
                }),
        Catch::Contains("file.h5: /twice: cannot be written: name already exists"));
    CHECK(fs::is_empty(folder.path()));
    const fs::path damaged = folder.write("damaged.h5", std::string(3000, 'x'));
    CHECK_THROWS_AS(h5::change_file(damaged, fill), OutputError);
}

TEST_CASE("an error of the caller while writing removes what was begun", "[core]") {
    const TemporaryFolder folder;
    const auto fails = [](Writer& writer) {
        fill(writer);
        throw InputError({"place", "found", "", ""});
    };
    CHECK_THROWS_AS(h5::write_file(folder / "file.h5", fails), InputError);
    CHECK(fs::is_empty(folder.path()));
}
