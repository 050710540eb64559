// SPDX-License-Identifier: GPL-2.0-or-later
// CORE (private): writing HDF5 files. One thread at a time; no object of the library leaves it.
#pragma once

#include <cstdint>
#include <filesystem>
#include <memory>
#include <span>
#include <string>
#include <vector>

#include "core/h5/dataset.h"
#include "core/h5/pages.h"
#include "deviascope/core/error.h"

namespace deviascope::h5 {

struct Draft;

/// An HDF5 file that is being made or changed. Objects are named by their absolute path inside
/// it.
///
/// What is written stays in memory (DraftFile), because the library keeps no order of its books
/// when the system refuses to write: on a full disk it ends in a crash, at the latest when the
/// program ends. Whoever wants the changes on the disk writes what `close` gives.
///
/// Numbers are little-endian, in chunks, shuffled, deflated (level 1: higher levels cost time
/// and gain little on draws; growing ones on request only) and checksummed; texts are UTF-8 of
/// fixed length. No times are stored, so that the same content gives the same bytes. The file
/// format is that of HDF5 1.10, whose checksums turn damage into errors. Errors of all members:
/// OutputError with file, object and reason.
class Writer {
  public:
    enum class Packing { plain, deflated };

    /// @param path  for messages only
    /// @param base  the file to change, longer alive than this; null: a new file
    /// @param room  memory to use, of pages that are wanted no more
    explicit Writer(const std::filesystem::path& path,
                    const Descriptor* base = nullptr,
                    Pages room = {});
    ~Writer();
    Writer(const Writer&) = delete;
    Writer& operator=(const Writer&) = delete;

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
    /// @param packing  noise takes ten times as long to deflate as to write, and stays as long
    void growing_reals(const std::string& path,
                       const About& about,
                       const Shape& entry,
                       const Shape& chunk,
                       Packing packing = Packing::deflated);
    void growing_integers(const std::string& path,
                          const About& about,
                          const Shape& entry,
                          const Shape& chunk);
    /// Appends whole entries to a growing dataset.
    void append(const std::string& path, std::span<const double> values);
    void append(const std::string& path, std::span<const std::int64_t> values);

    /// Closes the file and gives what has changed; the last call.
    Draft close();

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
