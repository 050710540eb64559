// SPDX-License-Identifier: GPL-2.0-or-later
// CORE (private to this folder): pages of a file, in memory
#pragma once

#include <cstdint>
#include <map>
#include <memory>
#include <vector>

#include "core/descriptor.h"

namespace deviascope::h5 {

inline constexpr std::uint64_t page_bytes = 4096;
/// Pages that go in one call at most.
inline constexpr std::size_t pages_together = 1024;

/// Pages of a file by number (offset / page_bytes). Pages added one after another mostly lie
/// one after another in memory, and are then written in one call. Memory that was touched once
/// is worth keeping: a fresh page costs the system more than copying into it.
class Pages {
  public:
    /// Null where there is no such page.
    char* find(std::uint64_t number) const;
    /// A new page, unset; there must be none of that number.
    char* add(std::uint64_t number);
    /// Drops all pages and keeps their memory for others.
    void clear();

    /// Writes the pages that begin before `length` bytes to a file; of the last one it may
    /// write more. Errors: OutputError.
    void write_to(const Descriptor& file, std::uint64_t length) const;

  private:
    /// Aligned as the system's larger pages are (2 MB).
    struct Slab {
        alignas(2097152) char bytes[pages_together * page_bytes];
    };

    std::map<std::uint64_t, char*> by_number_;
    std::vector<std::unique_ptr<Slab>> slabs_;
};

}  // namespace deviascope::h5
