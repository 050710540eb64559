// SPDX-License-Identifier: GPL-2.0-or-later
// Columns of tables that others wrote: found, checked, and read piece by piece.
#include <fmt/format.h>

#include <algorithm>

#include "core/h5/open_file.h"

namespace deviascope::h5 {

namespace {

constexpr std::size_t least_cache = std::size_t{1} << 20U;
constexpr std::size_t largest_cache = std::size_t{1} << 28U;

/// Bytes of one piece in which a dataset is stored; 0 where it lies in one.
std::size_t piece_bytes(const H5::DataSet& set) {
    const H5::DSetCreatPropList layout = set.getCreatePlist();
    if (layout.getLayout() != H5D_CHUNKED) return 0;
    hsize_t extent = 0;
    layout.getChunk(1, &extent);
    return static_cast<std::size_t>(extent) * set.getDataType().getSize();
}

/// Opens a column with room for one stored piece, so that none is unpacked twice.
H5::DataSet opened(const H5::H5File& file, const std::string& dataset) {
    const H5::DataSet set = file.openDataSet(dataset);
    const std::size_t piece = piece_bytes(set);
    if (piece <= least_cache || piece > largest_cache) return set;
    H5::DSetAccPropList access;
    access.setChunkCache(521, piece, 1.0);
    return file.openDataSet(dataset, access);
}

}  // namespace

bool Reader::is_of_kind(const std::string& object, int kind) const {
    if (!has(object)) return false;
    return translated(
        [&] {
            try {
                return object == "/" ? kind == H5O_TYPE_GROUP
                                     : parts_->file.childObjType(object) == kind;
            } catch (const H5::Exception&) {
                return false;  // a link that leads nowhere
            }
        },
        [&](const std::string& reason) { return failure(object, reason); });
}

bool Reader::is_group(const std::string& object) const {
    return is_of_kind(object, H5O_TYPE_GROUP);
}

bool Reader::is_dataset(const std::string& object) const {
    return is_of_kind(object, H5O_TYPE_DATASET);
}

std::optional<std::string> Reader::text_if_any(const std::string& object,
                                               const std::string& name) const {
    try {
        return text(object, name);
    } catch (const InputError&) {
        return {};
    }
}

std::size_t Reader::column_length(const std::string& dataset) const {
    const Found found = find(dataset);
    if (found.kind == Kind::text || found.kind == Kind::other)
        throw error(dataset,
                    "it holds " + name_of(found.kind),
                    "a dataset of integers or reals, one a row, for each column",
                    "name another column, or write it so");
    if (found.shape.size() != 1)
        throw error(
            dataset,
            fmt::format("it has {} axes ({})", found.shape.size(), text_of(found.shape)),
            "one number a row",
            "name another column");
    check_storage(dataset, found);
    return found.shape[0];
}

void Reader::read(const std::string& dataset,
                  std::size_t first,
                  std::span<double> values) const {
    auto known = parts_->columns.find(dataset);
    if (known == parts_->columns.end()) {
        const std::size_t length = column_length(dataset);
        H5::DataSet set =
            translated([&] { return opened(parts_->file, dataset); },
                       [&](const std::string& reason) { return failure(dataset, reason); });
        known = parts_->columns.emplace(dataset, Parts::Column{set, length}).first;
    }
    const Parts::Column& column = known->second;
    if (first > column.length || values.size() > column.length - first)
        throw error(dataset,
                    fmt::format("{} values", column.length),
                    fmt::format("at least {} are needed", first + values.size()));
    if (values.empty()) return;
    translated(
        [&] {
            H5::DataSpace in_file = column.set.getSpace();
            const hsize_t start = first, count = values.size();
            in_file.selectHyperslab(H5S_SELECT_SET, &count, &start);
            const H5::DataSpace in_memory(1, &count);
            column.set.read(values.data(), H5::PredType::NATIVE_DOUBLE, in_memory, in_file);
        },
        [&](const std::string& reason) { return failure(dataset, reason); });
}

}  // namespace deviascope::h5
