// SPDX-License-Identifier: GPL-2.0-or-later
#include "core/descriptor.h"

#include <fcntl.h>

#include <catch2/catch.hpp>
#include <string>
#include <vector>

#include "file_bytes.h"
#include "full_disk.h"
#include "temporary_folder.h"

using namespace deviascope;
using test::bytes_of;
using test::FullDisk;
using test::TemporaryFolder;

namespace {

namespace fs = std::filesystem;

struct Page {
    alignas(4096) char bytes[4096];
};

/// Pages of letters, and a view of them from some byte on.
class Letters {
  public:
    explicit Letters(std::size_t n_pages) : pages_(n_pages) {
        for (std::size_t at = 0; at < 4096 * n_pages; ++at)
            pages_[at / 4096].bytes[at % 4096] = static_cast<char>('a' + at / 100 % 26);
    }
    std::string_view from(std::size_t first) const {
        return {pages_.front().bytes + first, 4096 * pages_.size() - first};
    }

  private:
    std::vector<Page> pages_;
};

}  // namespace

TEST_CASE("what is written past the cache is what is read, wherever it goes", "[core]") {
    const TemporaryFolder folder;
    const Letters letters(40);
    // A file system in memory, where there is one: it may know nothing of the cache.
    const TemporaryFolder memory(fs::exists("/dev/shm") ? "/dev/shm" : folder.path());
    for (const fs::path& place : {folder.path(), memory.path()}) {
        const Descriptor file(place / "letters", O_RDWR | O_CREAT);
        file.write("before", 0);
        file.write_past_cache(letters.from(0), 4096);
        // Neither address nor size is one that the system takes so.
        file.write_past_cache(letters.from(100), 41 * 4096);
        std::string expected(4096, '\0');
        expected.replace(0, 6, "before").append(letters.from(0)).append(letters.from(100));
        CHECK(bytes_of(place / "letters") == expected);
        // Ordinary writing goes on, into what is there too.
        file.write("within", 5000);
        expected.replace(5000, 6, "within");
        CHECK(bytes_of(place / "letters") == expected);
        std::vector<char> found(6);
        CHECK(file.read(found, 5000) == 6);
        CHECK(std::string(found.begin(), found.end()) == "within");
    }
}

TEST_CASE("a write past the cache that the disk refuses is an error", "[core]") {
    const TemporaryFolder folder;
    const Letters letters(40);
    const Descriptor file(folder / "letters", O_RDWR | O_CREAT);
    const FullDisk full(20 * 4096);
    CHECK_THROWS_AS(file.write_past_cache(letters.from(0), 0), OutputError);
    const Descriptor closed;
    CHECK_THROWS_AS(closed.write_past_cache(letters.from(0), 0), OutputError);
}
