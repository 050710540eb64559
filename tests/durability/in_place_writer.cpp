// SPDX-License-Identifier: GPL-2.0-or-later
// What the chain is not: a file that is extended in place, flushed and put on the disk block by
// block. The sweep must find damage here, or it could not find any.
//   in_place_writer FOLDER [--resume]
#include <fcntl.h>
#include <hdf5.h>
#include <unistd.h>

#include <array>
#include <cstdio>
#include <cstring>
#include <string>

namespace {

constexpr hsize_t n_columns = 8, rows_a_block = 16, n_blocks = 12;
using Block = std::array<double, rows_a_block * n_columns>;

/// Rows that compress badly and follow from their number.
Block block_from(hsize_t first_row) {
    Block block{};
    for (hsize_t place = 0; place < block.size(); ++place)
        block[place] = 1.0 / static_cast<double>(first_row * n_columns + place + 1);
    return block;
}

hid_t new_dataset(hid_t file) {
    const hsize_t extent[2] = {0, n_columns}, most[2] = {H5S_UNLIMITED, n_columns};
    const hsize_t chunk[2] = {10, n_columns};
    const hid_t space = H5Screate_simple(2, extent, most);
    const hid_t list = H5Pcreate(H5P_DATASET_CREATE);
    H5Pset_chunk(list, 2, chunk);
    H5Pset_deflate(list, 1);
    const hid_t set =
        H5Dcreate2(file, "/draws", H5T_IEEE_F64LE, space, H5P_DEFAULT, list, H5P_DEFAULT);
    H5Pclose(list);
    H5Sclose(space);
    return set;
}

hsize_t rows_of(hid_t set) {
    hsize_t extent[2] = {0, 0};
    const hid_t space = H5Dget_space(set);
    H5Sget_simple_extent_dims(space, extent, nullptr);
    H5Sclose(space);
    return extent[0];
}

bool append(hid_t set, hsize_t first_row) {
    const hsize_t extent[2] = {first_row + rows_a_block, n_columns};
    const hsize_t start[2] = {first_row, 0}, count[2] = {rows_a_block, n_columns};
    const Block block = block_from(first_row);
    if (H5Dset_extent(set, extent) < 0) return false;
    const hid_t in_file = H5Dget_space(set), in_memory = H5Screate_simple(2, count, nullptr);
    H5Sselect_hyperslab(in_file, H5S_SELECT_SET, start, nullptr, count, nullptr);
    const herr_t status =
        H5Dwrite(set, H5T_NATIVE_DOUBLE, in_memory, in_file, H5P_DEFAULT, block.data());
    H5Sclose(in_memory);
    H5Sclose(in_file);
    return status >= 0;
}

bool put_on_disk(hid_t file, const std::string& path) {
    if (H5Fflush(file, H5F_SCOPE_GLOBAL) < 0) return false;
    const int descriptor = open(path.c_str(), O_RDONLY);
    const bool done = fsync(descriptor) == 0;
    close(descriptor);
    return done;
}

}  // namespace

int main(int argc, char** argv) {
    if (argc < 2) return 2;
    const std::string path = std::string(argv[1]) + "/chains.h5";
    const bool goes_on = argc > 2 && access(path.c_str(), F_OK) == 0;
    const hid_t file = goes_on
                           ? H5Fopen(path.c_str(), H5F_ACC_RDWR, H5P_DEFAULT)
                           : H5Fcreate(path.c_str(), H5F_ACC_TRUNC, H5P_DEFAULT, H5P_DEFAULT);
    if (file < 0) return 5;
    const hid_t set = goes_on ? H5Dopen2(file, "/draws", H5P_DEFAULT) : new_dataset(file);
    if (set < 0) return 5;
    for (hsize_t row = rows_of(set); row < n_blocks * rows_a_block; row += rows_a_block) {
        if (!append(set, row) || !put_on_disk(file, path)) return 5;
        std::printf("Stored %d rows up to step %d.\n",
                    static_cast<int>(rows_a_block),
                    static_cast<int>(row + rows_a_block));
        std::fflush(stdout);
    }
    return H5Dclose(set) < 0 || H5Fclose(file) < 0 ? 5 : 0;
}
