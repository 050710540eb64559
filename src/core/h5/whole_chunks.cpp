// SPDX-License-Identifier: GPL-2.0-or-later
#include "core/h5/whole_chunks.h"

#include <algorithm>
#include <bit>
#include <cstring>
#include <functional>
#include <utility>
#include <vector>

#include "core/h5/fletcher32.h"

namespace deviascope::h5 {
namespace {

constexpr std::size_t element_bytes = 8;
constexpr std::size_t checksum_bytes = 4;

/// The next place before `ends`, last axis fastest. @returns false after the last
bool step(Shape& place, const Shape& ends) {
    for (std::size_t axis = ends.size(); axis-- > 0;) {
        if (++place[axis] < ends[axis]) return true;
        place[axis] = 0;
    }
    return false;
}

/// Where an element lies in an array of that shape.
std::size_t place_in(const Shape& shape, const Shape& element) {
    std::size_t place = 0;
    for (std::size_t axis = 0; axis < shape.size(); ++axis)
        place = place * shape[axis] + element[axis];
    return place;
}

/// Empty where chunks are more than values and checksum, or there are none.
Shape plain_chunk_of(const H5::DataSet& set) {
    const H5::DSetCreatPropList list = set.getCreatePlist();
    if (list.getLayout() != H5D_CHUNKED || H5Pget_nfilters(list.getId()) != 1) return {};
    unsigned flags = 0, configuration = 0;
    std::size_t n_values = 0;
    const H5Z_filter_t filter = checked(
        H5Pget_filter2(list.getId(), 0, &flags, &n_values, nullptr, 0, nullptr, &configuration),
        "H5Pget_filter");
    if (filter != H5Z_FILTER_FLETCHER32) return {};
    std::vector<hsize_t> chunk(shape_of(set.getSpace()).size());
    list.getChunk(static_cast<int>(chunk.size()), chunk.data());
    return Shape(chunk.begin(), chunk.end());
}

bool are_stored_as_they_are(const H5::DataSet& set) {
    if (std::endian::native != std::endian::little) return false;
    const H5::DataType type = set.getDataType();
    return type == H5::PredType::IEEE_F64LE || type == H5::PredType::STD_I64LE;
}

bool fill(const Entries& entries, const Shape& chunk) {
    return !chunk.empty() && entries.first % chunk[0] == 0 && entries.shape[0] % chunk[0] == 0;
}

/// Makes `extent` 1 along the axes along which its elements are neighbours both in the chunk
/// and in the entries. @returns how many there are together
std::size_t take_neighbours(Shape& extent, const Shape& chunk, const Shape& entries) {
    std::size_t n_together = 1;
    for (std::size_t axis = extent.size(); axis-- > 0;) {
        const std::size_t n = std::exchange(extent[axis], 1);
        n_together *= n;
        if (n != chunk[axis] || n != entries[axis]) break;
    }
    return n_together;
}

/// Copies the values of the chunk that begins at `first` of the entries; what of it lies beyond
/// the dataset is zero.
void gather(const Entries& entries, const Shape& first, const Shape& chunk, char* to) {
    Shape extent(chunk.size());
    for (std::size_t axis = 0; axis < chunk.size(); ++axis)
        extent[axis] = std::min(chunk[axis], entries.shape[axis] - first[axis]);
    if (extent != chunk) std::fill_n(to, n_elements(chunk) * element_bytes, '\0');
    const std::size_t run_bytes = take_neighbours(extent, chunk, entries.shape) * element_bytes;
    Shape within(chunk.size(), 0), place = first;
    do {
        std::transform(first.begin(), first.end(), within.begin(), place.begin(), std::plus());
        std::memcpy(to + place_in(chunk, within) * element_bytes,
                    entries.values + place_in(entries.shape, place) * element_bytes,
                    run_bytes);
    } while (step(within, extent));
}

void append_checksum(char* bytes, std::size_t n_bytes) {
    const std::uint32_t sum = fletcher32({bytes, n_bytes});
    for (std::size_t k = 0; k < checksum_bytes; ++k)
        bytes[n_bytes + k] = static_cast<char>(sum >> (8U * k));
}

}  // namespace

bool write_whole_chunks(const H5::DataSet& set, const Entries& entries, DraftFile& draft) {
    const Shape chunk = plain_chunk_of(set);
    if (!fill(entries, chunk) || !are_stored_as_they_are(set)) return false;
    const std::size_t value_bytes = n_elements(chunk) * element_bytes;
    const std::size_t n_bytes = value_bytes + checksum_bytes;
    if (n_bytes > DraftFile::most_at_once) return false;
    Shape n_chunks(chunk.size()), number(chunk.size(), 0), first = number;
    for (std::size_t axis = 0; axis < chunk.size(); ++axis)
        n_chunks[axis] = (entries.shape[axis] + chunk[axis] - 1) / chunk[axis];
    do {
        std::transform(
            number.begin(), number.end(), chunk.begin(), first.begin(), std::multiplies());
        char* const bytes = draft.room_for(n_bytes);
        gather(entries, first, chunk, bytes);
        append_checksum(bytes, value_bytes);
        std::vector<hsize_t> offset = extents(first);
        offset[0] += entries.first;
        checked(H5Dwrite_chunk(set.getId(), H5P_DEFAULT, 0, offset.data(), n_bytes, bytes),
                "H5Dwrite_chunk");
    } while (step(number, n_chunks));
    return true;
}

}  // namespace deviascope::h5
