// SPDX-License-Identifier: GPL-2.0-or-later
// Catalogues in HDF5 files that others wrote: here, straight through the HDF5 library.
#include <H5Cpp.h>

#include <algorithm>
#include <catch2/catch.hpp>
#include <cmath>
#include <numeric>

#include "deviascope/catalogue/table.h"
#include "deviascope/core/error.h"
#include "temporary_folder.h"

using namespace deviascope;
using test::TemporaryFolder;

namespace {

template <class Value>
H5::DataSet add(H5::H5File& file,
                const std::string& name,
                const H5::PredType& stored,
                const H5::PredType& memory,
                const std::vector<Value>& values,
                hsize_t piece = 0) {
    const hsize_t n = values.size();
    H5::DSetCreatPropList layout;
    piece = std::min(piece, n);
    if (piece > 0) {
        layout.setChunk(1, &piece);
        layout.setDeflate(4);
    }
    H5::DataSet set = file.createDataSet(name, stored, H5::DataSpace(1, &n), layout);
    set.write(values.data(), memory);
    return set;
}

std::vector<double> counting(std::size_t n, double from) {
    std::vector<double> values(n);
    std::iota(values.begin(), values.end(), from);
    return values;
}

/// n rows in `group`: RA (double, compressed in pieces), S (float), N (16-bit), text, pairs.
void write_table(const std::filesystem::path& path, const std::string& group, std::size_t n) {
    H5::H5File file(path.string(), H5F_ACC_TRUNC);
    if (group != "") file.createGroup(group);
    const auto& real = H5::PredType::NATIVE_DOUBLE;
    const H5::DataSet ra =
        add(file, group + "/RA", H5::PredType::IEEE_F64BE, real, counting(n, 0.25), 30000);
    const H5::StrType text(H5::PredType::C_S1, 3);
    ra.createAttribute("unit", text, H5::DataSpace()).write(text, std::string("deg"));
    std::vector<double> s = counting(n, -1.0);
    if (n > 1) s[1] = std::nan("");
    add(file, group + "/S", H5::PredType::IEEE_F32LE, real, s);
    add(file, group + "/N", H5::PredType::STD_I16LE, real, std::vector<double>(n, -7.0));
    const hsize_t pairs[2] = {n, 2};
    file.createDataSet(group + "/V", real, H5::DataSpace(2, pairs));
    file.createDataSet(group + "/note", text, H5::DataSpace(1, pairs));
    file.createGroup(group + "/more");
}

std::unique_ptr<TableReader> open(const TemporaryFolder& folder,
                                  const std::optional<std::string>& table,
                                  const std::vector<std::string>& columns) {
    return open_table(folder / "dunlin.h5", table, columns);
}

}  // namespace

TEST_CASE("HDF5 columns of any number type arrive whole, in order and in chunks",
          "[catalogue]") {
    const TemporaryFolder folder;
    const std::size_t n = 50001;
    write_table(folder / "dunlin.h5", "/survey", n);
    for (const char* table : {"survey", "/survey", "/survey/"}) {
        const auto reader = open(folder, table, {"S", "ra", "N"});
        CHECK(reader->n_rows() == static_cast<std::int64_t>(n));
        CHECK(reader->unit_of(1) == "deg");
        CHECK(reader->unit_of(0).empty());
        CHECK(reader->place_of_row(0) == "row 1");
        TableChunk chunk;
        std::int64_t row = 0, n_wrong = 0;
        while (reader->next(chunk)) {
            REQUIRE(chunk.first_row == row);
            for (std::size_t i = 0; i < chunk.column[0].size(); ++i, ++row) {
                const auto at = static_cast<double>(row);
                n_wrong +=
                    row == 1 ? !std::isnan(chunk.column[0][i]) : chunk.column[0][i] != at - 1.0;
                n_wrong += chunk.column[1][i] != at + 0.25;
                n_wrong += chunk.column[2][i] != -7.0;
            }
        }
        CHECK(row == static_cast<std::int64_t>(n));
        CHECK(n_wrong == 0);
    }
}

TEST_CASE("an HDF5 column in pieces larger than the library keeps is read whole",
          "[catalogue]") {
    const TemporaryFolder folder;
    constexpr std::size_t n = 700000, piece = 300000;  // of 2.4 MB, beyond the usual 1 MB
    {
        H5::H5File file((folder / "dunlin.h5").string(), H5F_ACC_TRUNC);
        const H5::PredType number = H5::PredType::IEEE_F64LE;
        add(file, "/S", number, number, counting(n, 0.5), piece);
    }
    const auto reader = open(folder, "", {"S"});
    TableChunk chunk;
    std::size_t row = 0, n_wrong = 0;
    while (reader->next(chunk))
        for (const double value : chunk.column[0])
            n_wrong += value != static_cast<double>(row++) + 0.5;
    CHECK(row == n);
    CHECK(n_wrong == 0);
}

TEST_CASE("the table of an HDF5 file is the root group, or the only group in it",
          "[catalogue]") {
    const TemporaryFolder folder;
    write_table(folder / "dunlin.h5", "", 3);
    CHECK(open(folder, {}, {"RA"})->n_rows() == 3);
    CHECK(open(folder, "/", {"RA"})->n_rows() == 3);
    write_table(folder / "dunlin.h5", "/survey", 4);
    CHECK(open(folder, {}, {"RA"})->n_rows() == 4);
    TableChunk chunk;
    write_table(folder / "dunlin.h5", "/survey", 0);
    CHECK_FALSE(open(folder, {}, {"RA"})->next(chunk));
}

TEST_CASE("faults of an HDF5 catalogue are named", "[catalogue]") {
    const TemporaryFolder folder;
    write_table(folder / "dunlin.h5", "/survey", 4);
    const auto refused = [&](const std::optional<std::string>& table,
                             const std::vector<std::string>& columns,
                             const std::string& part) {
        CHECK_THROWS_WITH(open(folder, table, columns), Catch::Contains(part));
    };
    refused("survy", {"RA"}, "there is no group `survy`; the groups of its root are survey");
    refused("survey/RA", {"RA"}, "there is no group `survey/RA`");
    refused("/", {"RA"}, "/: the group holds no dataset; one dataset a column");
    refused("survey/more", {"RA"}, "/survey/more: the group holds no dataset");
    refused({},
            {"RAA"},
            "there is no column `RAA`; the columns are N, RA, S, V, note; did you "
            "mean `RA`?");
    refused({}, {"V"}, "/survey/V: it has 2 axes (4 x 2); one number a row");
    refused({}, {"note"}, "/survey/note: it holds fixed-length text; a dataset of integers");
    {
        H5::H5File file((folder / "dunlin.h5").string(), H5F_ACC_RDWR);
        const auto& real = H5::PredType::NATIVE_DOUBLE;
        add(file, "/survey/short", real, real, counting(3, 0.0));
        H5::CompType pair(std::size_t{16});
        pair.insertMember("a", 0, real);
        pair.insertMember("b", 8, real);
        const hsize_t n = 4;
        file.createDataSet("/survey/rows", pair, H5::DataSpace(1, &n));
        const hsize_t huge = hsize_t{1} << 50U, piece = 1024;
        H5::DSetCreatPropList layout;
        layout.setChunk(1, &piece);
        file.createDataSet("/survey/huge", real, H5::DataSpace(1, &huge), layout);
    }
    refused({}, {"RA", "short"}, "/survey/short: it holds 3 values; 4, as /survey/RA");
    refused(
        {}, {"rows"}, "/survey/rows: it holds another type; a dataset of integers or reals");
    refused({}, {"huge"}, "/survey/huge: 1125899906842624 values in 0 stored bytes");
    std::filesystem::resize_file(folder / "dunlin.h5", 900);
    CHECK_THROWS_AS(open(folder, {}, {"RA"}), InputError);
}
