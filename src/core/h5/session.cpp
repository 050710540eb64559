// SPDX-License-Identifier: GPL-2.0-or-later
#include "core/h5/session.h"

#include <fmt/format.h>

#include <algorithm>
#include <limits>
#include <regex>

namespace deviascope::h5 {

namespace {

std::string& words() {
    static std::string kept;  // HDF5 is called from one thread at a time
    return kept;
}

/// Of `truncated file: eof = 600, …` the meaning; of `…errno = 28, error message = 'No space
/// left on device'…` the system's words, else all.
std::string plain(const std::string& description) {
    static const std::regex system_words("error message = '([^']*)'");
    if (description.starts_with("truncated file")) return "the file is too short";
    std::smatch match;
    if (std::regex_search(description, match, system_words)) return match[1];
    return description;
}

/// Called once an entry of the error stack, innermost first.
herr_t keep_innermost(unsigned depth, const H5E_error2_t* entry, void*) {
    if (depth == 0 && entry->desc != nullptr) words() = plain(entry->desc);
    return 0;
}

/// Called by the library when a call of its interface fails, instead of printing.
herr_t on_failure(hid_t stack, void*) {
    // A later failure is often a consequence (closing what could not be written): keep the
    // first.
    if (words().empty()) H5Ewalk2(stack, H5E_WALK_UPWARD, keep_innermost, nullptr);
    return 0;
}

}  // namespace

Listening::Listening() {
    words().clear();
    H5Eset_auto2(H5E_DEFAULT, on_failure, nullptr);
}

Listening::~Listening() {
    H5Eset_auto2(H5E_DEFAULT, nullptr, nullptr);
}

std::string reason_of(const H5::Exception& exception) {
    if (!words().empty()) return words();
    return fmt::format("{}: {}", exception.getFuncName(), exception.getDetailMsg());
}

std::size_t n_elements(const Shape& shape) {
    std::size_t product = 1;
    for (const std::size_t extent : shape) {
        if (extent == 0) return 0;
        if (product > std::numeric_limits<std::size_t>::max() / extent) {
            product = std::numeric_limits<std::size_t>::max();
        } else {
            product *= extent;
        }
    }
    return product;
}

std::string text_of(const Shape& shape) {
    return shape.empty() ? "scalar" : fmt::format("{}", fmt::join(shape, " x "));
}

std::string name_of(Kind kind) {
    switch (kind) {
        case Kind::real64:
            return "64-bit real";
        case Kind::integer64:
            return "64-bit integer";
        case Kind::natural32:
            return "unsigned 32-bit integer";
        case Kind::number:
            return "number of another type";
        case Kind::text:
            return "fixed-length text";
        case Kind::other:
            break;
    }
    return "another type";
}

std::string library_version() {
    unsigned major = 0, minor = 0, release = 0;
    H5get_libversion(&major, &minor, &release);
    return fmt::format("{}.{}.{}", major, minor, release);
}

H5::StrType text_type(std::size_t n_bytes) {
    H5::StrType type(H5::PredType::C_S1, std::max<std::size_t>(n_bytes, 1));
    type.setCset(H5T_CSET_UTF8);
    type.setStrpad(H5T_STR_NULLPAD);
    return type;
}

Shape shape_of(const H5::DataSpace& space) {
    std::vector<hsize_t> found(static_cast<std::size_t>(space.getSimpleExtentNdims()));
    if (!found.empty()) space.getSimpleExtentDims(found.data());
    return Shape(found.begin(), found.end());
}

std::vector<hsize_t> extents(const Shape& shape) {
    return std::vector<hsize_t>(shape.begin(), shape.end());
}

}  // namespace deviascope::h5
