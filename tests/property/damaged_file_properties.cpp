// SPDX-License-Identifier: GPL-2.0-or-later
// Damage of a file must be an error or change nothing; never a crash, never other values.
#include <catch2/catch.hpp>
#include <functional>
#include <random>

#include "deviascope/core/error.h"
#include "example_chain.h"
#include "same_chain.h"
#include "temporary_folder.h"

using namespace deviascope;
using test::bytes_of;
using test::TemporaryFolder;

namespace {

constexpr int n_lengths = 400, n_flips = 1500;

/// Whether a damaged file was refused; checks that otherwise it reads as the sound one did.
bool is_refused(const std::function<bool()>& reads_the_same) {
    bool is_same = false;
    try {
        is_same = reads_the_same();
    } catch (const InputError&) {
        return true;
    }
    CHECK(is_same);
    return false;
}

/// Cuts the bytes at many lengths and flips single bits at many places.
/// @param seed  fixed before the first run
void damage(const std::string& sound,
            const TemporaryFolder& folder,
            std::uint64_t seed,
            const std::function<bool()>& reads_the_same) {
    for (int cut = 0; cut < n_lengths; ++cut) {
        const std::size_t length = sound.size() * static_cast<std::size_t>(cut) / n_lengths;
        folder.write("damaged.h5", sound.substr(0, length));
        INFO("cut to " << length << " bytes");
        CHECK(is_refused(reads_the_same));
    }
    std::mt19937_64 random(seed);
    int n_refused = 0;
    for (int flip = 0; flip < n_flips; ++flip) {
        std::string bytes = sound;
        const std::size_t place = random() % bytes.size();
        const std::uint64_t bit = random() % 8;
        bytes[place] = static_cast<char>(bytes[place] ^ (1 << bit));
        folder.write("damaged.h5", bytes);
        INFO("bit " << bit << " of byte " << place);
        if (is_refused(reads_the_same)) ++n_refused;
    }
    CHECK(n_refused > n_flips / 10);  // otherwise the flips met nothing
}

}  // namespace

TEST_CASE("a damaged chain is refused or reads as before", "[chain]") {
    const TemporaryFolder folder;
    test::write_example_chain(folder / "chains.h5");
    const Chain chain = read_chain(folder / "chains.h5");
    damage(bytes_of(folder / "chains.h5"), folder, 20260801, [&] {
        return test::same(read_chain(folder / "damaged.h5"), chain);
    });
}

TEST_CASE("a damaged counts file is refused or reads as before", "[counts]") {
    const TemporaryFolder folder;
    write_counts(folder / "counts.h5", {test::example_counts(), "digest", "0.1.0"});
    damage(bytes_of(folder / "counts.h5"), folder, 20260802, [&] {
        const CountsFile file = read_counts(folder / "damaged.h5");
        return test::same(file.counts, test::example_counts()) && file.digest == "digest" &&
               file.version == "0.1.0";
    });
}
