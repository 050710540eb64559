// SPDX-License-Identifier: GPL-2.0-or-later
// CORE (private): writing HDF5 files. Main thread only; no object of the library leaves here.
#pragma once

#include <cstdint>
#include <filesystem>
#include <memory>
#include <span>
#include <string>
#include <vector>

#include "core/h5/dataset.h"
#include "deviascope/core/error.h"

namespace deviascope::h5 {

/// An HDF5 file that is being made or changed, in memory. Objects are named by their absolute
/// path inside it.
///
/// In memory, because the library keeps no order of its books when the system refuses to write:
/// with a file of its own on a full disk it ends in a crash, at the latest when the program
/// ends. So the library never meets the disk; whoever wants the file there writes the bytes
/// that `close` gives.
///
/// Numbers are little-endian, in chunks, shuffled, deflated (level 1: higher levels cost time
/// and gain little on draws) and checksummed; texts are UTF-8 of fixed length. No times are
/// stored, so that the same content gives the same bytes. The file format is that of HDF5 1.10,
/// whose checksums turn damage into errors.
/// Errors of all members: OutputError with file, object and reason.
class Writer {
  public:
    /// A new file, or, where `image` is not empty, that file to be changed.
    /// @param path  for messages only
    explicit Writer(const std::filesystem::path& path, const std::string& image = {});
    ~Writer();
    Writer(const Writer&) = delete;
    Writer& operator=(const Writer&) = delete;

    bool has(const std::string& object) const;
    /// A new group; its parent must be there.
    void group(const std::string& path, const std::string& meaning);

    /// Sets an attribute of a group or dataset, replacing one of that name.
    void attribute(const std::string& object,
                   const std::string& name,
                   const std::string& value);
    void attribute(const std::string& object, const std::string& name, std::int64_t value);
    void attribute(const std::string& object, const std::string& name, double value);

    /// A new dataset of that shape, in row order. `chunk` empty: 65,536 elements.
    void dataset(const std::string& path,
                 const About& about,
                 const Shape& shape,
                 std::span<const double> values,
                 const Shape& chunk = {});
    void dataset(const std::string& path,
                 const About& about,
                 const Shape& shape,
                 std::span<const std::int64_t> values);
    void dataset(const std::string& path,
                 const About& about,
                 const Shape& shape,
                 std::span<const std::uint32_t> values);
    /// A list of texts, as one axis.
    void dataset(const std::string& path,
                 const About& about,
                 const std::vector<std::string>& texts);

    /// A new empty dataset that grows along its first axis: shape 0 x `entry`.
    void growing_reals(const std::string& path,
                       const About& about,
                       const Shape& entry,
                       const Shape& chunk);
    void growing_integers(const std::string& path,
                          const About& about,
                          const Shape& entry,
                          const Shape& chunk);
    /// Appends whole entries to a growing dataset.
    void append(const std::string& path, std::span<const double> values);
    void append(const std::string& path, std::span<const std::int64_t> values);

    /// Closes the file and gives its bytes; the last call.
    std::string close();

  private:
    struct Parts;
    struct Elements;
    struct Layout;
    void create(const std::string& path, const About& about, const Layout& layout);
    void write_new(const std::string& path,
                   const About& about,
                   const Layout& layout,
                   const Elements& elements);
    void append_elements(const std::string& path, const Elements& elements);
    void set_attribute(const std::string& object,
                       const std::string& name,
                       const Elements& value);
    template <class Call>
    auto attempt(const std::string& object, Call&& call) const;
    OutputError failure(const std::string& object, const std::string& reason) const;

    std::filesystem::path path_;
    std::unique_ptr<Parts> parts_;
};

}  // namespace deviascope::h5
