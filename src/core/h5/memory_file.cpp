// SPDX-License-Identifier: GPL-2.0-or-later
#include "core/h5/memory_file.h"

#include <algorithm>
#include <cstdint>
#include <cstring>

namespace deviascope::h5 {

namespace {

constexpr std::size_t step = std::size_t{1} << 20U;  // bytes the file grows by

// Where the superblock of version 2 and 3 holds the end of the file (HDF5 File Format
// Specification 3.0, section II.A).
constexpr std::size_t end_of_file_offset = 28;

std::size_t length_in_superblock(const char* bytes) {
    std::uint64_t length = 0;
    for (std::size_t byte = 8; byte-- > 0;)
        length = length << 8U | static_cast<unsigned char>(bytes[end_of_file_offset + byte]);
    return length;
}

H5::FileCreatPropList creation_without_times() {
    H5::FileCreatPropList list;
    checked(H5Pset_obj_track_times(list.getId(), false), "H5Pset_obj_track_times");
    return list;
}

bool is_of_open_file(H5FD_file_image_op_t use) {
    return use == H5FD_FILE_IMAGE_OP_FILE_OPEN || use == H5FD_FILE_IMAGE_OP_FILE_RESIZE;
}

}  // namespace

H5FD_file_image_callbacks_t MemoryFile::callbacks(Block* block) {
    H5FD_file_image_callbacks_t calls{};
    calls.udata = block;
    calls.image_malloc = [](size_t size, H5FD_file_image_op_t use, void* user) -> void* {
        void* bytes = std::malloc(size);
        if (is_of_open_file(use))
            *static_cast<Block*>(user) = {static_cast<char*>(bytes), size};
        return bytes;
    };
    calls.image_memcpy =
        [](void* to, const void* from, size_t size, H5FD_file_image_op_t, void*) {
            return std::memcpy(to, from, size);
        };
    calls.image_realloc =
        [](void* old, size_t size, H5FD_file_image_op_t, void* user) -> void* {
        auto* held = static_cast<Block*>(user);
        auto* bytes = static_cast<char*>(std::realloc(old, size));
        if (bytes == nullptr) return nullptr;
        // What was in the memory before must not reach a file.
        if (size > held->size) std::memset(bytes + held->size, 0, size - held->size);
        held->bytes = bytes;
        held->size = size;
        return bytes;
    };
    calls.image_free = [](void* bytes, H5FD_file_image_op_t use, void* user) -> herr_t {
        if (use == H5FD_FILE_IMAGE_OP_FILE_CLOSE) {
            static_cast<Block*>(user)->is_ours = true;
        } else {
            std::free(bytes);
        }
        return 0;
    };
    calls.udata_copy = [](void* user) { return user; };
    calls.udata_free = [](void*) -> herr_t { return 0; };
    return calls;
}

MemoryFile::MemoryFile(const std::string& image) : block_(std::make_unique<Block>()) {
    H5::FileAccPropList access;
    access.setLibverBounds(H5F_LIBVER_V110, H5F_LIBVER_V110);
    access.setCore(step, false);
    H5FD_file_image_callbacks_t calls = callbacks(block_.get());
    checked(H5Pset_file_image_callbacks(access.getId(), &calls), "H5Pset_file_image_callbacks");
    if (!image.empty()) {
        std::string copy = image;  // the library's interface wants it writable
        checked(H5Pset_file_image(access.getId(), copy.data(), copy.size()),
                "H5Pset_file_image");
    }
    // The library looks for a file of that name on the disk, and must not find one.
    const std::string name = "/dev/null/deviascope-in-memory";
    file_ = H5::H5File(
        name, image.empty() ? H5F_ACC_TRUNC : H5F_ACC_RDWR, creation_without_times(), access);
}

MemoryFile::~MemoryFile() {
    try {
        file_.close();
    } catch (const H5::Exception&) {
        // Whoever wanted the content has taken it.
    }
}

std::string MemoryFile::close() {
    file_.close();
    if (!block_->is_ours || block_->size < end_of_file_offset + 8)
        throw H5::Exception("close", "an object of the file is still open");
    return std::string(block_->bytes,
                       std::min(length_in_superblock(block_->bytes), block_->size));
}

}  // namespace deviascope::h5
