// SPDX-License-Identifier: GPL-2.0-or-later
// Replays the fuzzing corpus, and every find there has been, without a fuzzer.
#include <catch2/catch.hpp>
#include <filesystem>

#include "file_bytes.h"
#include "targets.h"

using namespace deviascope;
namespace fs = std::filesystem;

namespace {

int replay(const fuzz::Target& target, const char* kind) {
    const fs::path folder = fs::path(DEVIASCOPE_TEST_DATA) / "fuzz" / kind / target.name;
    if (!fs::exists(folder)) return 0;
    int n_files = 0;
    for (const auto& entry : fs::directory_iterator(folder)) {
        INFO(entry.path().string());
        const std::string bytes = test::bytes_of(entry.path());
        const auto* first = reinterpret_cast<const std::uint8_t*>(bytes.data());
        CHECK_NOTHROW(target.run({first, bytes.size()}));
        ++n_files;
    }
    return n_files;
}

}  // namespace

TEST_CASE("every file of the fuzzing corpus and every find is read or refused", "[fuzz]") {
    for (const fuzz::Target& target : fuzz::targets()) {
        INFO(target.name);
        CHECK(replay(target, "corpus") > 0);
        replay(target, "found");
    }
}
