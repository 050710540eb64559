// SPDX-License-Identifier: GPL-2.0-or-later
// CORE (private to this folder): pages of a file, in memory
#pragma once

#include <cstdint>
#include <map>
#include <vector>

#include "core/descriptor.h"
#include "deviascope/core/large_array.h"

namespace deviascope::h5 {

inline constexpr std::uint64_t page_bytes = 4096;
/// Pages that go in one call at most.
inline constexpr std::size_t pages_together = 1024;

/// Pages that hold so many bytes, the last of them perhaps in part.
constexpr std::uint64_t pages_for(std::uint64_t n_bytes) {
    return (n_bytes + page_bytes - 1) / page_bytes;
}

/// Pages of a file by number (offset / page_bytes). Pages added one after another mostly lie
/// one after another in memory, and are then written in one call. Memory that was touched once
/// is worth keeping: a fresh page costs the system more than copying into it.
class Pages {
  public:
    /// Null where there is no such page.
    char* find(std::uint64_t number) const;
    /// A new page, unset; there must be none of that number.
    char* add(std::uint64_t number);

    /// Memory of pages that have no number yet, in one piece, for whoever knows early what will
    /// be in them: `adopt` spares the copying. Unset, and the same until it is adopted.
    /// @param n_pages  pages_together at most
    char* reserve(std::size_t n_pages);
    /// Makes memory from `reserve` pages of the file.
    /// @returns false, and does nothing, if `memory` is not that or one of the pages is there
    bool adopt(const char* memory, std::uint64_t first, std::size_t n_pages);

    /// Drops all pages and keeps their memory for others.
    void clear();

    /// Writes the pages that begin before `length` bytes to a file; of the last one it may
    /// write more. Errors: OutputError.
    void write_to(const Descriptor& file, std::uint64_t length) const;

  private:
    using Slab = std::vector<char, LeavesUnset<char>>;
    /// Pages that are neighbours in the file and in memory.
    struct Run {
        char* memory = nullptr;
        std::size_t n_pages = 0;
        const char* end() const { return memory + n_pages * page_bytes; }
    };

    char* take(std::size_t n_pages);
    void place(std::uint64_t number, const Run& run);

    std::map<std::uint64_t, Run> runs_;  ///< by the number of their first page
    Run reserved_;
    std::vector<Slab> slabs_;  ///< each of pages_together pages
    std::size_t n_taken_ = 0;  ///< pages of the slabs, in order
};

}  // namespace deviascope::h5
