// SPDX-License-Identifier: GPL-2.0-or-later
// `check`, maps of counts, and warnings on suspicious input, through the built program.
#include <algorithm>
#include <catch2/catch.hpp>
#include <fstream>
#include <nlohmann/json.hpp>

#include "bad_input_files.h"
#include "deviascope/counts/counts_file.h"
#include "program_on_job.h"
#include "run_process.h"
#include "temporary_folder.h"

using namespace deviascope;
using namespace deviascope::test::bad_input;
using deviascope::test::ProcessResult;
using deviascope::test::run_on_job;
using deviascope::test::TemporaryFolder;

namespace {

std::string with(std::string text, const std::string& from, const std::string& to) {
    const std::size_t at = text.find(from);
    REQUIRE(at != std::string::npos);
    return text.replace(at, from.size(), to);
}

std::vector<std::string> files_in(const std::filesystem::path& folder) {
    std::vector<std::string> names;
    for (const auto& entry : std::filesystem::recursive_directory_iterator(folder))
        if (entry.is_regular_file())
            names.push_back(entry.path().lexically_relative(folder).string());
    std::ranges::sort(names);
    return names;
}

/// The sound catalogue with every twentieth row twice.
std::string rows_with_repeats() {
    std::string text = sound_rows(), more;
    std::size_t line = text.find('\n') + 1;
    for (int k = 0; line < text.size(); ++k) {
        const std::size_t end = text.find('\n', line) + 1;
        if (k % 20 == 0) more += text.substr(line, end - line);
        line = end;
    }
    return text + more;
}

}  // namespace

TEST_CASE("check says what would be done and writes nothing", "[app]") {
    const TemporaryFolder folder;
    write_sound_inputs(folder);
    const ProcessResult result = run_on_job(folder, "check", {"--strict"});
    INFO(result.out + result.err);
    CHECK(result.exit_code == 0);
    CHECK(result.err.empty());
    CHECK_THAT(
        result.out,
        Catch::Contains("Counted dunlin: 20 000 of 20 000 rows and 192 of 192 pixels kept.") &&
            Catch::Contains(
                "dunlin faint      10 000      192          1.000        3.75 +- 0.1") &&
            Catch::Contains(
                "10 parameters, 8 coordinates to sample, with 4 ensembles of 32 walkers") &&
            Catch::Contains("velocity (km/s)") &&
            Catch::Contains("dunlin: intrinsic dipole (10^-3)") &&
            Catch::EndsWith("The job can run. No warnings; nothing was written.\n"));
    CHECK(files_in(folder.path()) == std::vector<std::string>{"dunlin.csv", "job.toml"});
    CHECK(run_on_job(folder, "check", {"--quiet"}).out.empty());
}

TEST_CASE("check refuses what run would refuse", "[app]") {
    const TemporaryFolder folder;
    write_sound_inputs(folder);
    folder.write("job.toml", with(base_job, "[1.0, 2.0]", "[0.5, 0.6]"));
    const ProcessResult empty_bin = run_on_job(folder, "check");
    CHECK(empty_bin.exit_code == 3);
    CHECK_THAT(empty_bin.err, Catch::Contains("faint"));
    folder.write("dunlin.csv", "ra,dec,s\n1,x,1\n");
    CHECK(run_on_job(folder, "check").exit_code == 3);
    folder.write("job.toml", with(base_job, "nside = 4", "nside = 5"));
    CHECK(run_on_job(folder, "check").exit_code == 2);
}

TEST_CASE("suspicious input is warned of, and doubtful under --strict", "[app]") {
    const TemporaryFolder folder;
    write_sound_inputs(folder);
    const auto warned = [&](const std::string& job, const std::string& part) {
        folder.write("job.toml", job);
        const ProcessResult result = run_on_job(folder, "check", {"--strict"});
        INFO(result.err);
        CHECK(result.exit_code == 6);
        CHECK_THAT(result.err, Catch::StartsWith("Warning: ") && Catch::Contains(part));
        CHECK_THAT(result.out, Catch::Contains("One warning; nothing was written."));
    };
    warned(with(base_job, "mean = 3.75, sd = 0.1", "mean = 0.0046, sd = 0.001"),
           "survey dunlin: bin faint: the weight 0.0046 looks like the amplitude of a dipole");
    warned(with(base_job, "sd = 0.05", "sd = 1e-5"),
           "intrinsic.dunlin: its prior (sd 1e-05 a component) is narrower than the noise");
    folder.write("dunlin.csv", rows_with_repeats());
    warned(base_job, "dunlin: about 4.7 % of the rows");
}

TEST_CASE("warnings on suspicious input are kept in the summary", "[app]") {
    const TemporaryFolder folder;
    folder.write("dunlin.csv", rows_with_repeats());
    folder.write(
        "job.toml",
        with(with(base_job, "[velocity]", "[ensemble]\neffective_draws = 200\n[velocity]"),
             "mean = 3.75, sd = 0.1",
             "mean = 0.05, sd = 0.001"));
    const ProcessResult result =
        run_on_job(folder, "run", {"-o", (folder / "out").string(), "--quiet"});
    INFO(result.err);
    REQUIRE(result.exit_code == 0);
    std::ifstream file(folder / "out/summary.json");
    const std::string warnings = nlohmann::json::parse(file)["warnings"].dump();
    CHECK_THAT(warnings, Catch::Contains("stand at exactly the place of an earlier row"));
    CHECK_THAT(warnings, Catch::Contains("looks like the amplitude of a dipole"));
    CHECK_THAT(result.err, Catch::Contains("stand at exactly the place of an earlier row"));
}

TEST_CASE("count --maps writes maps that count as the catalogue does", "[app]") {
    const TemporaryFolder folder;
    write_sound_inputs(folder);
    folder.write(
        "job.toml",
        with(base_job,
             "frame = \"icrs\"\ncolumns",
             "frame = \"icrs\"\nexclude = [ { band = 20, frame = \"galactic\" } ]\ncolumns"));
    const std::string out = (folder / "out").string();
    REQUIRE(run_on_job(folder, "count", {"--maps", "-o", out}).exit_code == 0);
    CHECK(files_in(folder / "out") ==
          std::vector<std::string>{"counts.h5",
                                   "maps/dunlin/bright-counts.fits",
                                   "maps/dunlin/bright-exposure.fits",
                                   "maps/dunlin/faint-counts.fits",
                                   "maps/dunlin/faint-exposure.fits"});
    std::filesystem::remove(folder / "out/counts.h5");
    const ProcessResult again = run_on_job(folder, "count", {"--maps", "-o", out});
    CHECK(again.exit_code == 5);
    CHECK_THAT(again.err, Catch::Contains("already holds maps/dunlin/faint-counts.fits"));
    REQUIRE(run_on_job(folder, "count", {"--maps", "-o", out, "--replace"}).exit_code == 0);

    std::string job = with(base_job,
                           "select = { flux = [1.0, 2.0] }",
                           "counts = \"out/maps/dunlin/faint-counts.fits\"\nexposure = "
                           "\"out/maps/dunlin/faint-exposure.fits\"");
    job = with(job,
               "select = { flux = [2.0, inf] }",
               "counts = \"out/maps/dunlin/bright-counts.fits\"\nexposure = "
               "\"out/maps/dunlin/bright-exposure.fits\"");
    folder.write("job.toml", job);
    REQUIRE(run_on_job(folder, "count", {"-o", (folder / "again").string()}).exit_code == 0);
    const Counts first = read_counts(folder / "out/counts.h5").counts;
    const Counts second = read_counts(folder / "again/counts.h5").counts;
    for (std::size_t bin = 0; bin < 2; ++bin) {
        CHECK(second.surveys[0].bins[bin].count == first.surveys[0].bins[bin].count);
        CHECK(second.surveys[0].footprints[0].pixel == first.surveys[0].footprints[0].pixel);
    }
}
