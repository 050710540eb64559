// SPDX-License-Identifier: GPL-2.0-or-later
// CORE (private): reading HDF5 files. One thread at a time; no object of the library leaves it.
#pragma once

#include <cstdint>
#include <filesystem>
#include <memory>
#include <optional>
#include <span>
#include <string>
#include <vector>

#include "core/h5/dataset.h"
#include "deviascope/core/error.h"
#include "deviascope/core/large_array.h"

namespace deviascope::h5 {

/// An HDF5 file open for reading. Objects are named by their absolute path inside it.
///
/// Nothing is believed: rank, type and extents are checked against what the caller expects, and
/// a size that the stored bytes cannot hold is refused before memory is taken.
/// Errors of all members: InputError with file, object and reason.
class Reader {
  public:
    explicit Reader(const std::filesystem::path& path);
    ~Reader();
    Reader(const Reader&) = delete;
    Reader& operator=(const Reader&) = delete;

    const std::filesystem::path& path() const { return path_; }

    /// Whether a group or dataset of that path is there.
    bool has(const std::string& object) const;
    /// Whether it is there and is one.
    bool is_group(const std::string& object) const;
    bool is_dataset(const std::string& object) const;
    /// Names of the members of a group, in the order of their bytes.
    std::vector<std::string> names(const std::string& group) const;
    Found find(const std::string& dataset) const;
    /// Extents of a dataset that must have `rank` axes.
    Shape shape(const std::string& dataset, std::size_t rank) const;

    /// Extents of the chunks of a chunked dataset.
    Shape chunk(const std::string& dataset) const;

    /// Whole datasets of exactly that shape, in row order.
    std::vector<double> reals(const std::string& dataset, const Shape& expected) const;
    LargeArray large_reals(const std::string& dataset, const Shape& expected) const;
    std::vector<std::int64_t> integers(const std::string& dataset, const Shape& expected) const;
    std::vector<std::uint32_t> naturals(const std::string& dataset,
                                        const Shape& expected) const;
    std::vector<std::string> texts(const std::string& dataset, const Shape& expected) const;

    /// The last entry along the first axis of a dataset of exactly that shape (not empty).
    std::vector<double> last_reals(const std::string& dataset, const Shape& expected) const;
    std::vector<std::int64_t> last_integers(const std::string& dataset,
                                            const Shape& expected) const;

    /// Length of a one-dimensional dataset of any integer or real type, that holds what it
    /// says.
    std::size_t column_length(const std::string& dataset) const;
    /// Entries [first, first + values.size()) of such a dataset, as doubles. It stays open from
    /// the first call on, so that reading on from where the last call ended costs no search and
    /// unpacks nothing twice.
    void read(const std::string& dataset, std::size_t first, std::span<double> values) const;

    /// Attributes of a group or dataset; empty where absent. A text may be of fixed or variable
    /// length. Errors: of another type, or not a scalar.
    std::optional<std::string> text(const std::string& object, const std::string& name) const;
    std::optional<std::int64_t> integer(const std::string& object,
                                        const std::string& name) const;
    std::optional<double> real(const std::string& object, const std::string& name) const;
    /// A text attribute of a file of somebody else's: empty also where it is no text.
    std::optional<std::string> text_if_any(const std::string& object,
                                           const std::string& name) const;
    /// Attributes that must be there.
    std::string required_text(const std::string& object, const std::string& name) const;
    std::int64_t required_integer(const std::string& object, const std::string& name) const;
    double required_real(const std::string& object, const std::string& name) const;

    /// An error about an object of this file.
    InputError error(const std::string& object,
                     const std::string& found,
                     const std::string& allowed = "",
                     const std::string& remedy = "") const;

  private:
    struct Parts;
    template <class Array>
    Array entries(const std::string& dataset,
                  const Shape& expected,
                  Kind kind,
                  bool last_only) const;
    void check(const std::string& dataset, const Shape& expected, Kind kind) const;
    void check_storage(const std::string& dataset, const Found& found) const;
    bool is_of_kind(const std::string& object, int kind) const;
    template <class Value>
    std::optional<Value> attribute(const std::string& object, const std::string& name) const;
    template <class Value>
    Value required(const std::string& object, const std::string& name) const;
    InputError missing(const std::string& object) const;
    InputError failure(const std::string& object, const std::string& reason) const;

    std::filesystem::path path_;
    std::unique_ptr<Parts> parts_;
};

}  // namespace deviascope::h5
