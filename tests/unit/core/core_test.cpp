// SPDX-License-Identifier: GPL-2.0-or-later
#include <algorithm>
#include <catch2/catch.hpp>
#include <cstdint>
#include <numeric>
#include <stdexcept>
#include <string>
#include <vector>

#include "deviascope/core/digest.h"
#include "deviascope/core/error.h"
#include "deviascope/core/large_array.h"
#include "deviascope/core/nearest_name.h"
#include "deviascope/core/parallel.h"
#include "deviascope/core/random.h"
#include "temporary_folder.h"

using namespace deviascope;

TEST_CASE("a message keeps its grammar and leaves empty parts out", "[core]") {
    CHECK(Message{"a.toml:3:5", "found x", "y is allowed", "write y"}.text() ==
          "a.toml:3:5: found x; y is allowed; write y");
    CHECK(Message{"a.toml", "found x", "", ""}.text() == "a.toml: found x");
    CHECK(Message{"p", "bell \a and\nline", "", ""}.text() == "p: bell \\x07 and line");
}

TEST_CASE("a usage error lists every fault and carries exit code 2", "[core]") {
    const UsageError error(std::vector<Message>{{"a", "b", "", ""}, {"c", "d", "", ""}});
    CHECK(std::string(error.what()) == "a: b\nc: d");
    CHECK(error.exit_code() == ExitCode::usage);
    CHECK(error.messages().size() == 2);
}

TEST_CASE("ensure names file and line of a broken invariant", "[core]") {
    CHECK_NOTHROW(ensure(true, "fine"));
    CHECK_THROWS_AS(ensure(false, "two is three"), InternalError);
    CHECK_THROWS_WITH(ensure(false, "two is three"),
                      Catch::Contains("core_test.cpp") && Catch::Contains("two is three"));
}

TEST_CASE("Philox4x64-10 gives the known answers of Random123", "[core]") {
    // Source: kat_vectors of Random123 (Salmon et al. 2011, SC11), philox4x64 10 rounds,
    // zero counter and key. Values from memory; our counter's fourth word starts at 0.
    Stream stream(0, static_cast<Purpose>(0), 0, 0, 0);
    CHECK(stream() == 0x16554d9eca36314cULL);
    CHECK(stream() == 0xdb20fe9d672d0fdcULL);
    CHECK(stream() == 0xd7e772cee186176bULL);
    CHECK(stream() == 0x7e68b68aec7ba23bULL);
}

TEST_CASE("the first draws of a keyed stream are pinned", "[core]") {
    // A promise to users: the same seed gives the same numbers in every version.
    Stream a(20260817, Purpose::moves, 1, 2, 3);
    Stream b(20260817, Purpose::moves, 1, 2, 3);
    Stream c(20260817, Purpose::start, 1, 2, 3);
    std::vector<std::uint64_t> first(9);
    std::generate(first.begin(), first.end(), [&] { return a(); });
    for (const std::uint64_t word : first) CHECK(word == b());
    CHECK(first[0] != c());
    CHECK(std::adjacent_find(first.begin(), first.end()) == first.end());
}

TEST_CASE("uniform lies in 0 to 1 with the moments of a uniform variate", "[core]") {
    double sum = 0.0, sum_of_squares = 0.0;
    constexpr int n = 100000;
    for (int draw = 0; draw < n; ++draw) {
        Stream stream(1, Purpose::test, static_cast<std::uint64_t>(draw), 0, 0);
        const double u = uniform(stream);
        REQUIRE(u >= 0.0);
        REQUIRE(u < 1.0);
        sum += u;
        sum_of_squares += u * u;
    }
    // Standard errors: 0.29/sqrt(n) = 9.1e-4 and 0.298/sqrt(n) = 9.4e-4; four of them allowed.
    CHECK(sum / n == Approx(0.5).margin(3.7e-3));
    CHECK(sum_of_squares / n == Approx(1.0 / 3.0).margin(3.8e-3));
}

TEST_CASE("parallel_for visits every index once and rethrows the lowest failure", "[core]") {
    for (const int threads : {1, 2, 3}) {
        std::vector<int> visits(1000, 0);
        parallel_for(visits.size(), threads, [&](std::size_t i) { ++visits[i]; });
        CHECK(std::all_of(visits.begin(), visits.end(), [](int n) { return n == 1; }));
        CHECK_THROWS_WITH(parallel_for(100,
                                       threads,
                                       [](std::size_t i) {
                                           if (i >= 7)
                                               throw std::runtime_error(std::to_string(i));
                                       }),
                          "7");
    }
}

TEST_CASE("parallel_sequences goes through each sequence in order, those behind first",
          "[core]") {
    constexpr std::size_t n_sequences = 5, n_parts = 40;
    for (const int threads : {1, 2, 3, 8}) {
        CAPTURE(threads);
        std::vector<std::vector<std::size_t>> parts(n_sequences);
        parallel_sequences(
            n_sequences, n_parts, threads, [&](std::size_t sequence, std::size_t part) {
                parts[sequence].push_back(part);
            });
        std::vector<std::size_t> in_order(n_parts);
        std::iota(in_order.begin(), in_order.end(), std::size_t{0});
        for (const std::vector<std::size_t>& of_one : parts) CHECK(of_one == in_order);
    }
    // One thread: abreast.
    std::vector<std::size_t> visited;
    parallel_sequences(3, 2, 1, [&](std::size_t sequence, std::size_t part) {
        visited.push_back(10 * sequence + part);
    });
    CHECK(visited == std::vector<std::size_t>{0, 10, 20, 1, 11, 21});
    parallel_sequences(0, 4, 2, [](std::size_t, std::size_t) { FAIL("there is none"); });
    parallel_sequences(4, 0, 2, [](std::size_t, std::size_t) { FAIL("there is none"); });
}

TEST_CASE("a sequence that fails ends, the others go on, and the lowest failure is told",
          "[core]") {
    for (const int threads : {1, 2, 8}) {
        CAPTURE(threads);
        std::vector<std::size_t> n_parts(6, 0);
        const auto run = [&] {
            parallel_sequences(6, 10, threads, [&](std::size_t sequence, std::size_t part) {
                if ((sequence == 2 && part == 7) || (sequence == 4 && part == 1))
                    throw std::runtime_error(std::to_string(sequence));
                ++n_parts[sequence];
            });
        };
        CHECK_THROWS_WITH(run(), "2");
        CHECK(n_parts == std::vector<std::size_t>{10, 10, 7, 10, 1, 10});
    }
}

TEST_CASE("large arrays keep their values while they grow past the length of large pages",
          "[core]") {
    const std::size_t limit = large_from_bytes / sizeof(double);
    LargeArray array;
    for (const std::size_t n : {std::size_t{1}, limit - 1, limit, limit + 1, 3 * limit}) {
        const std::size_t n_before = array.size();
        array.resize(n);
        for (std::size_t place = n_before; place < n; ++place)
            array[place] = static_cast<double>(place);
        const bool begins_at_large_page =
            reinterpret_cast<std::uintptr_t>(array.data()) % large_page_bytes == 0;
        CHECK((n < limit || begins_at_large_page));
        std::size_t n_wrong = 0;
        for (std::size_t place = 0; place < n; ++place)
            n_wrong += array[place] != static_cast<double>(place);
        CHECK(n_wrong == 0);
    }
    const LargeArray copy = array;
    array.resize(2);
    array.shrink_to_fit();
    CHECK(array == LargeArray{0.0, 1.0});
    CHECK(copy.size() == 3 * limit);
    CHECK(copy.back() == static_cast<double>(3 * limit - 1));
}

TEST_CASE("nearest_name finds typing errors and stays silent otherwise", "[core]") {
    const std::vector<std::string> known = {"velocity", "intrinsic", "nside", "seed"};
    CHECK(nearest_name("velocty", known) == "velocity");
    CHECK(nearest_name("NSIDE", known) == "nside");
    CHECK(nearest_name("sede", known) == "seed");
    CHECK(nearest_name("colour", known).empty());
    CHECK(nearest_name("", known).empty());
}

TEST_CASE("SHA-256 gives the published digests", "[core]") {
    // Source: NIST, FIPS 180-4 example values ("abc", the two-block message) and the empty
    // message.
    CHECK(digest_of("abc") ==
          "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad");
    CHECK(digest_of("abcdbcdecdefdefgefghfghighijhijkijkljklmklmnlmnomnopnopq") ==
          "248d6a61d20638b8e5c026930c3e6039a33ce45964ff2167f6ecedd419db06c1");
    CHECK(digest_of("") == "e3b0c44298fc1c149afbf4c8996fb92427ae41e4649b934ca495991b7852b855");
    Digest pieces;
    for (const char* piece : {"a", "", "bc"}) pieces.add(std::string_view(piece));
    CHECK(pieces.hex() == digest_of("abc"));
    CHECK(digest_of(std::string(1000000, 'a')) ==
          "cdc76e5c9914fb9281a1c7e284d73e67f1809a48a497200e046d39ccc7112cd0");
    CHECK_THROWS_AS(digest_of_file("/nonexistent/dunlin.fits"), InputError);
}

TEST_CASE("the digest of a file says how far it is, and ends where it is told to", "[core]") {
    const test::TemporaryFolder folder;
    const auto path = folder.write("dunlin.csv", std::string(3 << 20, 'a'));
    std::vector<std::string> lines;
    const auto tell = [&](const std::string& line) { lines.push_back(line); };
    CHECK(digest_of_file(path, tell) == digest_of(std::string(3 << 20, 'a')));
    REQUIRE(lines.size() >= 3);
    CHECK(lines[2] == "dunlin.csv: 3 MiB digested");
    struct Enough {};
    const auto stop = [](const std::string&) { throw Enough(); };
    CHECK_THROWS_AS(digest_of_file(path, stop), Enough);
}
