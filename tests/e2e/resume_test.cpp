// SPDX-License-Identifier: GPL-2.0-or-later
// --resume through the built program. What a kill leaves behind is held to account in
// tests/durability.
#include <catch2/catch.hpp>
#include <chrono>
#include <csignal>
#include <set>
#include <string>
#include <thread>

#include "deviascope/chain/chain_file.h"
#include "lattice_job.h"
#include "program_on_job.h"
#include "run_process.h"
#include "same_chain.h"
#include "temporary_folder.h"

using namespace deviascope;
using namespace deviascope::test;

namespace {

namespace fs = std::filesystem;

void write_job(const TemporaryFolder& folder, const std::string& ensemble) {
    folder.write("binnacle.csv", lattice_catalogue(20000));
    folder.write("job.toml", small_job(bins(3.75, 6.0), ensemble));
}

std::vector<std::string> command(const TemporaryFolder& folder,
                                 const std::string& output,
                                 const std::vector<std::string>& more) {
    return test::words_on_job(folder, "run", output, more);
}

ProcessResult run_job(const TemporaryFolder& folder,
                      const std::string& output,
                      const std::vector<std::string>& more) {
    return run_process(command(folder, output, more));
}

/// Files of a folder and of its folders, by their paths in it.
std::set<std::string> files_in(const fs::path& folder) {
    std::set<std::string> names;
    for (const auto& entry : fs::recursive_directory_iterator(folder))
        if (entry.is_regular_file())
            names.insert(fs::relative(entry.path(), folder).generic_string());
    return names;
}

/// All that may differ are the times of day.
void check_same_results(const fs::path& one, const fs::path& other) {
    const std::set<std::string> files = files_in(one);
    REQUIRE(files == files_in(other));
    for (const std::string& file : files) {
        CAPTURE(file);
        if (file != "chains.h5") CHECK(bytes_of(one / file) == bytes_of(other / file));
    }
    Chain first = read_chain(one / "chains.h5");
    const Chain second = read_chain(other / "chains.h5");
    first.provenance.started = second.provenance.started;
    first.provenance.ended = second.provenance.ended;
    CHECK(same(first, second));
}

constexpr const char* long_run = "effective_draws = 1e9\nmax_steps = 100000000\n";

}  // namespace

TEST_CASE("a run that is interrupted and resumed ends as one that was not", "[app]") {
    const TemporaryFolder folder;
    write_job(folder, "effective_draws = 1e9\nmax_steps = 2000\nwalkers = 20\n");
    REQUIRE(run_job(folder, "whole", {"--threads", "2"}).exit_code == 0);
    CHECK(files_in(folder / "whole") ==
          std::set<std::string>{"counts.h5", "chains.h5", "summary.json", "summary.txt"});
    for (const int milliseconds : {20, 300, 900}) {
        CAPTURE(milliseconds);
        fs::remove_all(folder / "cut");
        Process process(command(folder, "cut", {"--rows-per-block", "2", "--threads", "1"}));
        std::this_thread::sleep_for(std::chrono::milliseconds(milliseconds));
        process.send(SIGINT);
        process.wait();
        const ProcessResult resumed =
            run_job(folder, "cut", {"--resume", "--threads", "3", "--quiet"});
        INFO(resumed.err);
        REQUIRE(resumed.exit_code == 0);
        check_same_results(folder / "whole", folder / "cut");
    }
}

TEST_CASE("resuming starts where nothing is, and makes only the summary where all is done",
          "[app]") {
    const TemporaryFolder folder;
    write_job(folder, "effective_draws = 300\n");
    REQUIRE(run_job(folder, "whole", {}).exit_code == 0);
    REQUIRE(run_job(folder, "resumed", {"--resume"}).exit_code == 0);
    check_same_results(folder / "whole", folder / "resumed");
    const std::string chain = bytes_of(folder / "resumed" / "chains.h5");
    fs::remove(folder / "resumed" / "summary.json");
    fs::remove(folder / "resumed" / "counts.h5");
    const ProcessResult again = run_job(folder, "resumed", {"--resume"});
    CHECK(again.exit_code == 0);
    CHECK_THAT(again.out, Catch::Contains("The chain is complete"));
    CHECK(bytes_of(folder / "resumed" / "chains.h5") == chain);
    check_same_results(folder / "whole", folder / "resumed");

    SECTION("another job text is refused") {
        folder.write("job.toml", small_job(bins(3.75, 6.5), "effective_draws = 300\n"));
        const ProcessResult result = run_job(folder, "resumed", {"--resume"});
        CHECK(result.exit_code == 2);
        CHECK_THAT(result.err,
                   Catch::Contains("another job text") && Catch::Contains("--replace"));
    }
    SECTION("other bytes of an input are refused, and named") {
        folder.write("binnacle.csv", lattice_catalogue(20001));
        const ProcessResult result = run_job(folder, "resumed", {"--resume"});
        CHECK(result.exit_code == 2);
        CHECK_THAT(result.err, Catch::Contains("other bytes of binnacle.csv"));
    }
    SECTION("counts of other inputs are refused where there is no chain") {
        fs::remove(folder / "resumed" / "chains.h5");
        folder.write("binnacle.csv", lattice_catalogue(20001));
        const ProcessResult result = run_job(folder, "resumed", {"--resume"});
        CHECK(result.exit_code == 2);
        CHECK_THAT(result.err, Catch::Contains("counts.h5"));
    }
    CHECK(bytes_of(folder / "whole" / "summary.json") ==
          bytes_of(folder / "resumed" / "summary.json"));
}

TEST_CASE("a second writer is refused and disturbs nothing", "[app]") {
    const TemporaryFolder folder;
    write_job(folder, long_run);
    Process process(command(folder, "out", {"--rows-per-block", "50"}));
    for (int wait = 0; wait < 3000 && !fs::exists(folder / "out" / "chains.h5.next"); ++wait)
        std::this_thread::sleep_for(std::chrono::milliseconds(20));
    for (const char* option : {"--resume", "--replace", "--quiet"}) {
        const ProcessResult second = run_job(folder, "out", {option});
        CHECK(second.exit_code == 5);
        CHECK_THAT(second.err,
                   Catch::Contains("chains.h5.lock") &&
                       Catch::Contains("another process is writing this chain"));
    }
    process.send(SIGTERM);
    const ProcessResult first = process.wait();
    CHECK(first.exit_code == 130);
    CHECK_THAT(first.err, Catch::Contains("--resume"));
    CHECK(files_in(folder / "out") == std::set<std::string>{"counts.h5", "chains.h5"});
    CHECK(read_chain(folder / "out" / "chains.h5").draws.n_rows > 0);
}
