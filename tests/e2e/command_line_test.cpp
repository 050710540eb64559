// SPDX-License-Identifier: GPL-2.0-or-later
#include <catch2/catch.hpp>
#include <string>
#include <vector>

#include "run_process.h"
#include "temporary_folder.h"

using deviascope::test::ProcessResult;
using deviascope::test::TemporaryFolder;

namespace {

ProcessResult deviascope_with(std::vector<std::string> words) {
    words.insert(words.begin(), DEVIASCOPE_PROGRAM);
    return deviascope::test::run_process(words);
}

}  // namespace

TEST_CASE("help and version go to standard output with exit code 0", "[app]") {
    const ProcessResult help = deviascope_with({"--help"});
    CHECK(help.exit_code == 0);
    CHECK_THAT(help.out, Catch::Contains("run") && Catch::Contains("Exit codes"));
    CHECK(help.err.empty());
    const ProcessResult version = deviascope_with({"--version"});
    CHECK(version.exit_code == 0);
    CHECK_THAT(version.out,
               Catch::StartsWith("deviascope ") && Catch::Contains("HEALPix C++ 3") &&
                   Catch::Contains("ERFA "));
}

TEST_CASE("a wrong command line is one message and exit code 2", "[app]") {
    const std::vector<std::vector<std::string>> wrong = {
        {},
        {"rn", "job.toml"},
        {"run"},
        {"run", "job.toml", "--threads", "0"},
        {"run", "job.toml", "--treads", "2"},
        {"count", "job.toml", "--strict"},
        {"count", "job.toml", "--resume"},
        {"run", "job.toml", "--resume", "--replace"}};
    for (const auto& words : wrong) {
        const ProcessResult result = deviascope_with(words);
        CHECK(result.exit_code == 2);
        CHECK(result.out.empty());
        CHECK_THAT(result.err, Catch::StartsWith("deviascope: command line: "));
    }
}

TEST_CASE("a word that is no command is answered with the nearest one", "[app]") {
    CHECK(deviascope_with({"sumarise", "chains.h5"}).err ==
          "deviascope: command line: there is no command \"sumarise\"; the commands are run, "
          "check, count, weigh, sample, summarise, figures, export, compare, sweep, mock; did "
          "you mean "
          "summarise?\n");
}

TEST_CASE("a job file that is not there is exit code 2 and names the path", "[app]") {
    const ProcessResult result = deviascope_with({"run", "/nonexistent/dunlin.toml"});
    CHECK(result.exit_code == 2);
    CHECK_THAT(result.err, Catch::Contains("/nonexistent/dunlin.toml"));
}

TEST_CASE("all faults of a job file are reported together", "[app]") {
    const TemporaryFolder folder;
    const auto job = folder.write("dunlin.toml",
                                  "[job]\nseed = 1.5\nnsde = 64\n"
                                  "[velocity]\nprior = \"free-velocty\"\n");
    const ProcessResult result =
        deviascope_with({"run", job.string(), "-o", (folder / "out").string()});
    CHECK(result.exit_code == 2);
    CHECK_THAT(result.err,
               Catch::Contains("dunlin.toml:2:") && Catch::Contains("seed") &&
                   Catch::Contains("nside") && Catch::Contains("free-velocity") &&
                   Catch::Contains("survey"));
    CHECK_FALSE(std::filesystem::exists(folder / "out"));
}

TEST_CASE("something that is no chain is exit code 3", "[app]") {
    const TemporaryFolder folder;
    const auto file = folder.write("chains.h5", "not a chain");
    const ProcessResult result = deviascope_with({"summarise", file.string()});
    CHECK(result.exit_code == 3);
    CHECK_THAT(result.err, Catch::Contains("chains.h5"));
    CHECK(
        deviascope_with({"summarise", (folder / "nowhere" / "chains.h5").string()}).exit_code ==
        3);
    CHECK_FALSE(std::filesystem::exists(folder / "nowhere"));
}
