// SPDX-License-Identifier: GPL-2.0-or-later
// CORE (private): what reader and writer of HDF5 files agree on
#pragma once

#include <cstddef>
#include <cstdint>
#include <string>
#include <vector>

namespace deviascope::h5 {

/// Extents of a dataset, slowest axis first; empty for a scalar.
using Shape = std::vector<std::size_t>;

/// Product of the extents. Saturates instead of wrapping, so that a damaged file cannot pretend
/// to be small.
std::size_t n_elements(const Shape& shape);

/// For instance `12 x 4 x 144`.
std::string text_of(const Shape& shape);

/// What the elements of a dataset are. `number`: any other integer or real type, which can only
/// be read as doubles.
enum class Kind { real64, integer64, natural32, number, text, other };
std::string name_of(Kind kind);

/// What a dataset says about itself: becomes its attributes `meaning`, `unit` and `dimensions`.
struct About {
    std::string meaning;     ///< one plain sentence
    std::string unit;        ///< `1` where there is none; empty for texts
    std::string dimensions;  ///< one word an axis, for instance `row x replicate x walker`
};

/// A dataset as found in a file.
struct Found {
    Shape shape;
    Kind kind = Kind::other;
    std::size_t element_bytes = 0;
    std::uint64_t stored_bytes = 0;  ///< in the file, after compression
};

/// Version of the HDF5 library in use, for instance `1.10.8`.
std::string library_version();

}  // namespace deviascope::h5
