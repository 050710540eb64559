// SPDX-License-Identifier: GPL-2.0-or-later
// Files with one fault each, and the sound ones they are made from.
#pragma once

#include <H5Cpp.h>
#include <zlib.h>

#include <cmath>
#include <cstring>
#include <string>
#include <vector>

#include "core/fits/fits_file.h"
#include "deviascope/chain/chain_file.h"
#include "deviascope/counts/counts_file.h"
#include "deviascope/sky/moc.h"
#include "example_chain.h"
#include "file_bytes.h"
#include "temporary_folder.h"

namespace deviascope::test::bad_input {

namespace fs = std::filesystem;

inline const std::string base_job = R"([job]
seed = 1
nside = 4
frame = "icrs"
[velocity]
prior = "free-velocity"
[intrinsic]
prior = { kind = "gaussian", sd = 0.05 }
[[survey]]
name = "dunlin"
catalogue = "dunlin.csv"
frame = "icrs"
columns = { lon = "ra", lat = "dec", flux = "s" }
[[survey.bin]]
name = "faint"
select = { flux = [1.0, 2.0] }
weight = { mean = 3.75, sd = 0.1 }
[[survey.bin]]
name = "bright"
select = { flux = [2.0, inf] }
weight = { mean = 6.0, sd = 0.1 }
)";

/// 20,000 positions on a lattice of golden-ratio steps, in two bins: too many for any prior of
/// the job to be narrower than their noise.
inline const std::string& sound_rows() {
    static const std::string rows = [] {
        std::string text = "ra,dec,s\n";
        constexpr int n = 20000;
        for (int k = 0; k < n; ++k) {
            const double turn = k * 0.6180339887498949;
            const double lon = 360.0 * (turn - std::floor(turn));
            const double lat = std::asin((2.0 * k + 1.0) / n - 1.0) * 57.29577951308232;
            text += std::to_string(lon) + ',' + std::to_string(lat) +
                    (k % 2 == 0 ? ",1.5\n" : ",3.0\n");
        }
        return text;
    }();
    return rows;
}

inline void write_sound_inputs(const TemporaryFolder& folder) {
    folder.write("job.toml", base_job);
    folder.write("dunlin.csv", sound_rows());
}

inline void cut(const fs::path& path, double share) {
    const auto size = static_cast<double>(fs::file_size(path));
    fs::resize_file(path, static_cast<std::uintmax_t>(share * size));
}

inline void write_junk(const TemporaryFolder& folder) {
    folder.write("a.dat", std::string("\x01\x00\x02\x00junk", 8));
}

// ---- gzip ----

inline std::string gzipped(const std::string& text) {
    const TemporaryFolder folder;
    const fs::path path = folder / "a.gz";
    gzFile file = gzopen(path.c_str(), "wb");
    gzwrite(file, text.data(), static_cast<unsigned>(text.size()));
    gzclose(file);
    return bytes_of(path);
}
inline void write_cut_gzip(const TemporaryFolder& folder) {
    cut(folder.write("a.csv.gz", gzipped(sound_rows())), 0.5);
}
inline void write_double_gzip(const TemporaryFolder& folder) {
    folder.write("a.csv.gz", gzipped(gzipped(sound_rows())));
}

// ---- FITS tables ----

inline void write_table(const TemporaryFolder& folder,
                        const std::vector<fits::TableWriter::NewColumn>& columns) {
    fits::TableWriter file(folder / "a.fits", "SOURCES", columns);
    for (std::size_t column = 0; column < columns.size(); ++column)
        if (columns[column].form.back() == 'D') {
            const std::size_t width = columns[column].form == "2D" ? 2 : 1;
            file.write(column, 0, std::vector<double>(1000 * width, 1.5));
        }
    file.close();
}
inline void write_fits(const TemporaryFolder& folder) {
    write_table(folder, {{"ra", "D", "deg"}, {"dec", "D", "deg"}, {"s", "D", ""}});
}
inline void write_cut_fits(const TemporaryFolder& folder) {
    write_fits(folder);
    cut(folder / "a.fits", 0.5);
}
inline void write_broken_header(const TemporaryFolder& folder) {
    write_fits(folder);
    fs::resize_file(folder / "a.fits", 4000);
}
inline void write_fits_without_table(const TemporaryFolder& folder) {
    write_fits(folder);
    fs::resize_file(folder / "a.fits", 2880);
}
inline void write_fits_without_column(const TemporaryFolder& folder) {
    write_table(folder, {{"ra", "D", "deg"}, {"decl", "D", "deg"}, {"s", "D", ""}});
}
inline void write_fits_with_text(const TemporaryFolder& folder) {
    write_table(folder, {{"ra", "12A", ""}, {"dec", "D", ""}, {"s", "D", ""}});
}
inline void write_fits_with_vectors(const TemporaryFolder& folder) {
    write_table(folder, {{"ra", "2D", "deg"}, {"dec", "D", ""}, {"s", "D", ""}});
}

// ---- HDF5 tables ----

inline void write_h5_columns(const TemporaryFolder& folder,
                             const std::vector<std::pair<std::string, hsize_t>>& columns) {
    H5::H5File file((folder / "a.h5").string(), H5F_ACC_TRUNC);
    for (const auto& [name, n] : columns) {
        const H5::DataSet set =
            file.createDataSet(name, H5::PredType::NATIVE_DOUBLE, H5::DataSpace(1, &n));
        set.write(std::vector<double>(n, 1.5).data(), H5::PredType::NATIVE_DOUBLE);
    }
}
inline void write_h5(const TemporaryFolder& folder) {
    write_h5_columns(folder, {{"ra", 1000}, {"dec", 1000}, {"s", 1000}});
}
inline void write_h5_without_column(const TemporaryFolder& folder) {
    write_h5_columns(folder, {{"ra", 1000}, {"decl", 1000}, {"s", 1000}});
}
inline void write_h5_of_unlike_length(const TemporaryFolder& folder) {
    write_h5_columns(folder, {{"ra", 1000}, {"dec", 999}, {"s", 1000}});
}
inline void write_h5_with_pairs(const TemporaryFolder& folder) {
    write_h5_columns(folder, {{"ra", 1000}, {"s", 1000}});
    H5::H5File file((folder / "a.h5").string(), H5F_ACC_RDWR);
    const hsize_t shape[2] = {1000, 2};
    file.createDataSet("dec", H5::PredType::NATIVE_DOUBLE, H5::DataSpace(2, shape));
}
inline void write_cut_h5(const TemporaryFolder& folder) {
    write_h5(folder);
    fs::resize_file(folder / "a.h5", 600);
}

// ---- maps ----

struct MapCards {
    std::string pixtype = "HEALPIX", ordering = "RING", coordsys = "C";
    std::int64_t nside = 4;
};

/// A map of nside 4, or of 2 where there are fewer values.
inline void write_map(const fs::path& path, const std::vector<double>& values, MapCards cards) {
    if (values.size() == 48) cards.nside = 2;
    fits::TableWriter writer(path, "MAP", {{"VALUE", "D", ""}});
    if (!cards.pixtype.empty()) writer.card("PIXTYPE", cards.pixtype, "");
    writer.card("ORDERING", cards.ordering, "");
    writer.card("INDXSCHM", std::string("IMPLICIT"), "");
    if (!cards.coordsys.empty()) writer.card("COORDSYS", cards.coordsys, "");
    if (cards.nside != 0) writer.card("NSIDE", cards.nside, "");
    writer.write(0, 0, values);
    writer.close();
}
inline void write_cut_map(const TemporaryFolder& folder) {
    write_map(folder / "exposure.fits", std::vector<double>(192, 1.0), {});
    cut(folder / "exposure.fits", 0.7);
}
inline void write_moc_table(const fs::path& path, const char* dimension, std::int64_t number) {
    fits::TableWriter writer(path, "MOC", {{"UNIQ", "K", ""}});
    writer.card("ORDERING", std::string("NUNIQ"), "");
    writer.card("COORDSYS", std::string("C"), "");
    writer.card("MOCDIM", std::string(dimension), "");
    writer.write(0, 0, std::vector<std::int64_t>{4, number});
    writer.close();
}
inline void write_wrong_moc(const TemporaryFolder& folder) {
    write_moc_table(folder / "exposure.fits", "SPACE", 3);
}
inline void write_time_moc(const TemporaryFolder& folder) {
    write_moc_table(folder / "exposure.fits", "TIME", 5);
}
inline void write_moc_as_counts(const TemporaryFolder& folder) {
    write_moc(folder / "counts.fits", Moc({{0, 1}}));
}

// ---- chains and counts ----

/// A chain without a stored row yet.
inline void write_young_chain(const TemporaryFolder& folder) {
    ChainWriter writer(folder / "chains.h5",
                       example_provenance(),
                       example_parameters(),
                       example_vectors(),
                       example_counts(),
                       example_options());
}
inline void write_foreign_chain(const TemporaryFolder& folder) {
    write_h5(folder);
    fs::rename(folder / "a.h5", folder / "chains.h5");
}
inline void write_counts_as_chain(const TemporaryFolder& folder) {
    write_counts(folder / "chains.h5", {example_counts(), "digest", "0.1.0"});
}
inline void write_newer_chain(const TemporaryFolder& folder) {
    write_young_chain(folder);
    H5::H5File file((folder / "chains.h5").string(), H5F_ACC_RDWR);
    const std::int64_t schema = 99;
    H5::Attribute(file.openGroup("/").openAttribute("schema"))
        .write(H5::PredType::NATIVE_INT64, &schema);
}
inline void write_cut_chain(const TemporaryFolder& folder) {
    write_young_chain(folder);
    cut(folder / "chains.h5", 0.5);
}
/// One bit of the file's signature, the first thing that is read.
inline void flip_bit(const fs::path& path) {
    std::fstream file(path, std::ios::binary | std::ios::in | std::ios::out);
    file.seekg(1);
    const char flipped = static_cast<char>(file.get() ^ 0x10);
    file.seekp(1);
    file.put(flipped);
}
inline void write_bent_chain(const TemporaryFolder& folder) {
    write_young_chain(folder);
    flip_bit(folder / "chains.h5");
}
inline void write_counts_of_another_job(const TemporaryFolder& folder) {
    write_sound_inputs(folder);
    fs::create_directory(folder / "out");
    write_counts(folder / "out/counts.h5", {example_counts(), "digest", "0.1.0"});
}
inline void write_bent_counts(const TemporaryFolder& folder) {
    write_counts_of_another_job(folder);
    flip_bit(folder / "out/counts.h5");
}
inline void write_cut_counts(const TemporaryFolder& folder) {
    write_counts_of_another_job(folder);
    cut(folder / "out/counts.h5", 0.5);
}

}  // namespace deviascope::test::bad_input
