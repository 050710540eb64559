// SPDX-License-Identifier: GPL-2.0-or-later
#include "core/h5/reader.h"

#include <fmt/format.h>

#include <algorithm>
#include <cstring>
#include <system_error>

#include "core/h5/open_file.h"

namespace deviascope::h5 {

namespace {

/// Deflate packs at most 1032 bytes into one (zlib's technical notes); a dataset that claims
/// more than that, and more than a few bytes, does not hold what it says.
constexpr std::uint64_t highest_compression = 1032;

H5::PredType memory_type(double) {
    return H5::PredType::NATIVE_DOUBLE;
}
H5::PredType memory_type(std::int64_t) {
    return H5::PredType::NATIVE_INT64;
}
H5::PredType memory_type(std::uint32_t) {
    return H5::PredType::NATIVE_UINT32;
}

Kind kind_of_integer(const H5::IntType& type) {
    const bool is_signed = type.getSign() != H5T_SGN_NONE;
    if (type.getSize() == 8 && is_signed) return Kind::integer64;
    if (type.getSize() == 4 && !is_signed) return Kind::natural32;
    return Kind::number;
}

Kind kind_of(const H5::DataSet& set) {
    switch (set.getTypeClass()) {
        case H5T_FLOAT:
            return set.getFloatType().getSize() == 8 ? Kind::real64 : Kind::number;
        case H5T_INTEGER:
            return kind_of_integer(set.getIntType());
        case H5T_STRING:
            return set.getStrType().isVariableStr() ? Kind::other : Kind::text;
        default:
            return Kind::other;
    }
}

/// A padded text without its padding.
std::string unpadded(const char* first, std::size_t n_bytes) {
    while (n_bytes > 0 && first[n_bytes - 1] == '\0') --n_bytes;
    return std::string(first, n_bytes);
}

/// Selects the last entry along the first axis of `space`; returns the matching memory space.
H5::DataSpace select_last(H5::DataSpace& space, const Shape& shape) {
    std::vector<hsize_t> start(shape.size(), 0), count = extents(shape);
    start[0] = shape[0] - 1;
    count[0] = 1;
    space.selectHyperslab(H5S_SELECT_SET, count.data(), start.data());
    return H5::DataSpace(static_cast<int>(count.size()), count.data());
}

}  // namespace

Reader::Reader(const std::filesystem::path& path)
    : path_(path), parts_(std::make_unique<Parts>()) {
    std::error_code failed;
    const auto status = std::filesystem::status(path, failed);
    if (!std::filesystem::exists(status))
        throw InputError({path.string(), "there is no such file", "", "check the path"});
    if (!std::filesystem::is_regular_file(status))
        throw InputError({path.string(), "not a regular file", "an HDF5 file is needed", ""});
    parts_->n_bytes = std::filesystem::file_size(path, failed);
    const auto refuse = [this](const std::string& reason) { return failure("", reason); };
    const bool is_ours = translated(
        [&] {
            try {
                return H5::H5File::isHdf5(path.string());
            } catch (const H5::Exception&) {
                return false;  // shorter than any signature, or not readable
            }
        },
        refuse);
    if (!is_ours)
        throw InputError({path.string(),
                          "no HDF5 file, or its beginning is damaged",
                          "an HDF5 file is needed",
                          "check the path, or make the file again"});
    translated(
        [&] {
            // Strong: an object that could not be opened must not keep the file open.
            H5::FileAccPropList access;
            access.setFcloseDegree(H5F_CLOSE_STRONG);
            parts_->file.openFile(path.string(), H5F_ACC_RDONLY, access);
        },
        refuse);
}

Reader::~Reader() {
    try {
        parts_->columns.clear();
        parts_->file.close();
    } catch (const H5::Exception&) {
        // Nothing was written, so nothing can be lost.
    }
}

InputError Reader::error(const std::string& object,
                         const std::string& found,
                         const std::string& allowed,
                         const std::string& remedy) const {
    const std::string place = object.empty() ? path_.string() : path_.string() + ": " + object;
    return InputError({place, found, allowed, remedy});
}

InputError Reader::missing(const std::string& object) const {
    return error(object,
                 "missing",
                 "",
                 "the file is damaged or was not written by this program; make it again");
}

InputError Reader::failure(const std::string& object, const std::string& reason) const {
    const bool is_locked = reason.find("lock file") != std::string::npos ||
                           reason.find("temporarily unavailable") != std::string::npos;
    return error(object,
                 "cannot be read: " + reason,
                 "",
                 is_locked ? "another process is writing it; try again in a moment"
                           : "the file is damaged or was cut short; make it again");
}

bool Reader::has(const std::string& object) const {
    return translated(
        [&] {
            // The library answers for the last link only, and fails where one before is
            // absent.
            for (std::size_t end = object.find('/', 1);; end = object.find('/', end + 1)) {
                if (object == "/") return true;
                if (!parts_->file.nameExists(object.substr(0, end))) return false;
                if (end == std::string::npos) return true;
            }
        },
        [&](const std::string& reason) { return failure(object, reason); });
}

std::vector<std::string> Reader::names(const std::string& group) const {
    if (!has(group)) throw missing(group);
    return translated(
        [&] {
            const H5::Group open = parts_->file.openGroup(group);
            std::vector<std::string> found;
            for (hsize_t member = 0; member < open.getNumObjs(); ++member)
                found.push_back(open.getObjnameByIdx(member));
            std::sort(found.begin(), found.end());
            return found;
        },
        [&](const std::string& reason) { return failure(group, reason); });
}

Found Reader::find(const std::string& dataset) const {
    if (!has(dataset)) throw missing(dataset);
    return translated(
        [&] {
            const H5::DataSet set = parts_->file.openDataSet(dataset);
            Found found;
            found.shape = shape_of(set.getSpace());
            found.kind = kind_of(set);
            found.element_bytes = set.getDataType().getSize();
            found.stored_bytes = set.getStorageSize();
            return found;
        },
        [&](const std::string& reason) { return failure(dataset, reason); });
}

Shape Reader::shape(const std::string& dataset, std::size_t rank) const {
    const Shape found = find(dataset).shape;
    if (found.size() != rank)
        throw error(dataset,
                    fmt::format("{} axes ({})", found.size(), text_of(found)),
                    fmt::format("{} are needed", rank));
    return found;
}

Shape Reader::chunk(const std::string& dataset) const {
    const std::size_t rank = find(dataset).shape.size();
    return translated(
        [&] {
            const H5::DataSet set = parts_->file.openDataSet(dataset);
            std::vector<hsize_t> found(rank);
            set.getCreatePlist().getChunk(static_cast<int>(rank), found.data());
            return Shape(found.begin(), found.end());
        },
        [&](const std::string& reason) { return failure(dataset, reason); });
}

void Reader::check(const std::string& dataset, const Shape& expected, Kind kind) const {
    const Found found = find(dataset);
    if (found.kind != kind)
        throw error(dataset, "holds " + name_of(found.kind), name_of(kind) + " is needed");
    if (found.shape != expected)
        throw error(dataset,
                    "extents " + text_of(found.shape),
                    text_of(expected) + " by the rest of the file",
                    "the file is damaged; make it again");
    check_storage(dataset, found);
}

/// Refuses a size that the stored bytes cannot hold.
void Reader::check_storage(const std::string& dataset, const Found& found) const {
    const std::uint64_t stored = std::min(found.stored_bytes, parts_->n_bytes);
    const std::size_t claimed = n_elements(found.shape);
    if (claimed > stored * highest_compression / found.element_bytes)
        throw error(dataset,
                    fmt::format("{} values in {} stored bytes", claimed, stored),
                    "the values cannot be in the file",
                    "the file is damaged; make it again");
}

template <class Array>
Array Reader::entries(const std::string& dataset,
                      const Shape& expected,
                      Kind kind,
                      bool last_only) const {
    check(dataset, expected, kind);
    Array values(n_elements(expected) / (last_only ? expected[0] : 1));
    if (values.empty()) return values;
    translated(
        [&] {
            const H5::DataSet set = parts_->file.openDataSet(dataset);
            H5::DataSpace in_file = set.getSpace();
            const H5::DataSpace in_memory =
                last_only ? select_last(in_file, expected) : in_file;
            set.read(
                values.data(), memory_type(typename Array::value_type{}), in_memory, in_file);
        },
        [&](const std::string& reason) { return failure(dataset, reason); });
    return values;
}

std::vector<double> Reader::reals(const std::string& dataset, const Shape& expected) const {
    return entries<std::vector<double>>(dataset, expected, Kind::real64, false);
}

LargeArray Reader::large_reals(const std::string& dataset, const Shape& expected) const {
    return entries<LargeArray>(dataset, expected, Kind::real64, false);
}

std::vector<std::int64_t> Reader::integers(const std::string& dataset,
                                           const Shape& expected) const {
    return entries<std::vector<std::int64_t>>(dataset, expected, Kind::integer64, false);
}

std::vector<std::uint32_t> Reader::naturals(const std::string& dataset,
                                            const Shape& expected) const {
    return entries<std::vector<std::uint32_t>>(dataset, expected, Kind::natural32, false);
}

std::vector<double> Reader::last_reals(const std::string& dataset,
                                       const Shape& expected) const {
    return entries<std::vector<double>>(dataset, expected, Kind::real64, true);
}

std::vector<std::int64_t> Reader::last_integers(const std::string& dataset,
                                                const Shape& expected) const {
    return entries<std::vector<std::int64_t>>(dataset, expected, Kind::integer64, true);
}

std::vector<std::string> Reader::texts(const std::string& dataset,
                                       const Shape& expected) const {
    check(dataset, expected, Kind::text);
    const std::size_t n_texts = n_elements(expected), n_bytes = find(dataset).element_bytes;
    std::vector<char> padded(n_texts * n_bytes);
    translated(
        [&] {
            if (padded.empty()) return;
            const H5::DataSet set = parts_->file.openDataSet(dataset);
            set.read(padded.data(), set.getStrType());
        },
        [&](const std::string& reason) { return failure(dataset, reason); });
    std::vector<std::string> texts;
    for (std::size_t text = 0; text < n_texts; ++text)
        texts.push_back(unpadded(padded.data() + text * n_bytes, n_bytes));
    return texts;
}

}  // namespace deviascope::h5
