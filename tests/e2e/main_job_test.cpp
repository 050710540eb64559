// SPDX-License-Identifier: GPL-2.0-or-later
// The main job on a small mock sky, from catalogues to a summary, through the built program.
#include <algorithm>
#include <catch2/catch.hpp>
#include <chrono>
#include <csignal>
#include <fstream>
#include <iterator>
#include <nlohmann/json.hpp>
#include <string>
#include <thread>

#include "deviascope/chain/chain_file.h"
#include "file_bytes.h"
#include "lattice_job.h"
#include "program_on_job.h"
#include "run_process.h"
#include "temporary_folder.h"

using namespace deviascope;
using deviascope::test::bins;
using deviascope::test::lattice_catalogue;
using deviascope::test::Process;
using deviascope::test::ProcessResult;
using deviascope::test::small_job;
using deviascope::test::TemporaryFolder;

namespace {

ProcessResult run_job(const TemporaryFolder& folder, const std::vector<std::string>& more) {
    return test::run_into_out(folder, "run", more);
}

nlohmann::json summary_in(const std::filesystem::path& folder) {
    std::ifstream file(folder / "summary.json");
    return nlohmann::json::parse(file);
}

constexpr const char* quick = "effective_draws = 500\n";

}  // namespace

TEST_CASE("one command turns a catalogue into counts, chain and summary", "[app]") {
    const TemporaryFolder folder;
    folder.write("binnacle.csv", lattice_catalogue(20000));
    folder.write("job.toml", small_job(bins(3.75, 6.0), quick));
    const ProcessResult first = run_job(folder, {});
    INFO(first.err);
    REQUIRE(first.exit_code == 0);
    CHECK_THAT(first.out, Catch::Contains("velocity") && Catch::Contains("binnacle"));
    const nlohmann::json summary = summary_in(folder / "out");
    CHECK(summary["schema"] == 1);
    CHECK(summary["bins"][0]["sources"] == 10000);
    CHECK(summary["sampling"]["converged"] == true);

    SECTION("nothing existing is overwritten without --replace") {
        const ProcessResult second = run_job(folder, {});
        CHECK(second.exit_code == 5);
        CHECK_THAT(second.err, Catch::Contains("chains.h5") && Catch::Contains("--replace"));
    }
    SECTION("a run with --replace that fails on its way costs nothing") {
        folder.write("binnacle.csv", "ra,dec,s\n10,,1.5\n");
        CHECK(run_job(folder, {"--replace"}).exit_code == 3);
        CHECK(summary_in(folder / "out") == summary);
        CHECK(read_chain(folder / "out" / "chains.h5").draws.n_rows > 0);
    }
    SECTION("what stands where a result goes is an output error") {
        std::filesystem::remove(folder / "out" / "summary.txt");
        std::filesystem::create_directories(folder / "out" / "summary.txt" / "inside");
        const ProcessResult blocked = run_job(folder, {"--replace"});
        CHECK(blocked.exit_code == 5);
        CHECK_THAT(blocked.err, Catch::Contains("summary.txt"));
    }
    SECTION("the chain file alone gives the same summary") {
        std::filesystem::remove(folder / "binnacle.csv");
        std::filesystem::copy(folder / "out" / "chains.h5", folder / "chains.h5");
        const ProcessResult again = test::run_process(
            {DEVIASCOPE_PROGRAM, "summarise", (folder / "chains.h5").string(), "--quiet"});
        INFO(again.err);
        REQUIRE(again.exit_code == 0);
        CHECK(again.out.empty());
        CHECK(summary_in(folder.path()) == summary);
    }
    SECTION("another number of threads gives the same bits") {
        const Chain one = read_chain(folder / "out" / "chains.h5");
        for (const char* threads : {"1", "3"}) {
            REQUIRE(run_job(folder, {"--replace", "--threads", threads}).exit_code == 0);
            const Chain other = read_chain(folder / "out" / "chains.h5");
            CHECK(one.draws.value == other.draws.value);
            CHECK(one.draws.log_posterior == other.draws.log_posterior);
        }
    }
    SECTION("sample uses the counts that are there, and refuses those of another job") {
        std::filesystem::remove(folder / "out" / "chains.h5");
        const auto sample_job = [&] {
            return test::run_process({DEVIASCOPE_PROGRAM,
                                      "sample",
                                      (folder / "job.toml").string(),
                                      "-o",
                                      (folder / "out").string()});
        };
        const ProcessResult sampled = sample_job();
        CHECK(sampled.exit_code == 0);
        CHECK_THAT(sampled.out, Catch::Contains("inputs are unchanged"));
        std::filesystem::remove(folder / "out" / "chains.h5");
        folder.write("binnacle.csv", lattice_catalogue(30000));
        CHECK(sample_job().exit_code == 5);
    }
}

TEST_CASE("equal weights are called not separated, and doubtful under --strict", "[app]") {
    const TemporaryFolder folder;
    folder.write("binnacle.csv", lattice_catalogue(20000));
    folder.write("job.toml", small_job(bins(4.16, 4.16), quick));
    const ProcessResult result = run_job(folder, {"--strict"});
    INFO(result.err);
    CHECK(result.exit_code == 6);
    const nlohmann::json summary = summary_in(folder / "out");
    CHECK_THAT(summary["separation"]["joint"]["verdict"].get<std::string>(),
               Catch::StartsWith("not separated"));
    CHECK(summary["separation"]["binnacle"]["weight_spread"].get<double>() ==
          Approx(0.0).margin(1e-12));
    CHECK_THAT(result.out, Catch::Contains("not separated"));
}

TEST_CASE("a job of monopoles alone runs to its summary", "[app]") {
    // Gamma-Poisson: the monopole of N sources over the whole sky has median near N / (4 pi).
    const TemporaryFolder folder;
    folder.write("binnacle.csv", lattice_catalogue(20000));
    std::string job = small_job(bins(3.75, 6.0), quick);
    const auto replace = [&](const std::string& from, const std::string& to) {
        job.replace(job.find(from), from.size(), to);
    };
    replace("prior = \"free-velocity\"", "prior = \"no-motion\"");
    replace("prior = { kind = \"gaussian\", sd = 0.05 }", "prior = \"no-intrinsic\"");
    folder.write("job.toml", job);
    const ProcessResult result = run_job(folder, {});
    INFO(result.err);
    REQUIRE(result.exit_code == 0);
    const nlohmann::json summary = summary_in(folder / "out");
    CHECK(summary["bins"][0]["monopole"]["median"].get<double>() ==
          Approx(10000 / (4 * 3.14159265358979)).epsilon(0.002));
    CHECK(summary["velocity"]["amplitude"]["median"].is_null());  // it is a constant
}

TEST_CASE("a run that cannot converge says so in every output", "[app]") {
    const TemporaryFolder folder;
    folder.write("binnacle.csv", lattice_catalogue(20000));
    folder.write("job.toml",
                 small_job(bins(3.75, 6.0), "max_steps = 1000\neffective_draws = 1e9\n"));
    const ProcessResult result = run_job(folder, {});
    CHECK(result.exit_code == 0);
    CHECK_THAT(result.out, Catch::Contains("NOT converged"));
    const nlohmann::json summary = summary_in(folder / "out");
    CHECK(summary["sampling"]["converged"] == false);
    REQUIRE(!summary["warnings"].empty());
}

TEST_CASE(
    "a run ends with report, figures, tables and sky files, and its chain gives them again",
    "[app]") {
    const TemporaryFolder folder;
    folder.write("binnacle.csv", lattice_catalogue(20000));
    folder.write("job.toml", small_job(bins(3.75, 6.0), quick));
    const ProcessResult run = test::run_process({DEVIASCOPE_PROGRAM,
                                                 "run",
                                                 (folder / "job.toml").string(),
                                                 "-o",
                                                 (folder / "out").string(),
                                                 "--quiet"});
    INFO(run.err);
    REQUIRE(run.exit_code == 0);
    for (const char* name : {"report.html",
                             "figures/directions.svg",
                             "figures/joint.pdf",
                             "figures/traces.png",
                             "figures/data/profile-binnacle.csv",
                             "tables/results.tex",
                             "tables/bins.csv",
                             "sky/direction-velocity-icrs.fits",
                             "sky/region95-intrinsic-binnacle.moc.fits",
                             "sky/residuals-binnacle.fits"})
        CHECK(std::filesystem::file_size(folder / "out" / name) > 100);

    std::filesystem::copy(folder / "out" / "chains.h5", folder / "chains.h5");
    const auto with_chain = [&](std::vector<std::string> words) {
        words.insert(words.begin() + 1, (folder / "chains.h5").string());
        words.insert(words.begin(), DEVIASCOPE_PROGRAM);
        return test::run_process(words);
    };
    REQUIRE(with_chain({"figures", "--quiet"}).exit_code == 0);
    for (const char* name : {"report.html",
                             "figures/directions.svg",
                             "figures/directions.pdf",
                             "tables/results.tex",
                             "sky/region68-velocity.moc.fits"})
        CHECK(test::bytes_of(folder / name) == test::bytes_of(folder / "out" / name));
    CHECK(with_chain({"figures"}).exit_code == 5);  // they are there
    CHECK(with_chain({"figures", "--only", "traces"}).exit_code == 5);
    CHECK(
        with_chain({"figures", "--only", "traces", "--width", "90mm", "--replace"}).exit_code ==
        0);
    CHECK_THAT(with_chain({"figures", "--only", "wights"}).err,
               Catch::Contains("did you mean \"weights\"?"));
    CHECK(with_chain({"figures", "--width", "wide"}).exit_code == 2);
    REQUIRE(with_chain({"export", "--format", "csv,csv.gz", "--thin", "2"}).exit_code == 0);
    CHECK_THAT(test::bytes_of(folder / "draws.csv"),
               Catch::StartsWith("step,replicate,walker,log_posterior"));
}

TEST_CASE("Ctrl-C ends a run with exit code 130 and a chain that can be read", "[app]") {
    const TemporaryFolder folder;
    folder.write("binnacle.csv", lattice_catalogue(20000));
    folder.write("job.toml",
                 small_job(bins(3.75, 6.0), "effective_draws = 1e9\nmax_steps = 100000000\n"));
    Process process({DEVIASCOPE_PROGRAM,
                     "run",
                     (folder / "job.toml").string(),
                     "-o",
                     (folder / "out").string()});
    std::this_thread::sleep_for(std::chrono::seconds(4));
    process.send(SIGINT);
    const ProcessResult result = process.wait();
    INFO(result.err);
    CHECK(result.exit_code == 130);
    CHECK_THAT(result.out, Catch::Contains("interrupted"));
    const Chain chain = read_chain(folder / "out" / "chains.h5");
    CHECK(chain.draws.n_rows > 0);
    CHECK(chain.outcome.end == Outcome::End::interrupted);
    CHECK_THAT(result.err, Catch::Contains("chains.h5") && Catch::Contains("--resume"));
}

TEST_CASE("results do not depend on the order of the catalogue's rows", "[app]") {
    const TemporaryFolder folder;
    std::string text = lattice_catalogue(20000);
    folder.write("binnacle.csv", text);
    folder.write("job.toml", small_job(bins(3.75, 6.0), quick));
    REQUIRE(run_job(folder, {}).exit_code == 0);
    const Chain forward = read_chain(folder / "out" / "chains.h5");

    std::vector<std::string> lines;
    std::istringstream in(text);
    for (std::string line; std::getline(in, line);) lines.push_back(line + '\n');
    std::reverse(lines.begin() + 1, lines.end());
    std::string backward_text;
    for (const std::string& line : lines) backward_text += line;
    folder.write("binnacle.csv", backward_text);
    REQUIRE(run_job(folder, {"--replace"}).exit_code == 0);
    CHECK(read_chain(folder / "out" / "chains.h5").draws.value == forward.draws.value);
}
