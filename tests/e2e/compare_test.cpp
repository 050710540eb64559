// SPDX-License-Identifier: GPL-2.0-or-later
// `compare` and `sweep`, deduplication and measured dispersions, through the built program.
#include <algorithm>
#include <catch2/catch.hpp>
#include <cmath>
#include <fstream>
#include <nlohmann/json.hpp>
#include <set>
#include <sstream>
#include <string>

#include "deviascope/chain/chain_file.h"
#include "file_bytes.h"
#include "lattice_job.h"
#include "program_on_job.h"
#include "run_process.h"
#include "temporary_folder.h"

using namespace deviascope;
using Catch::Contains;
using deviascope::test::bins;
using deviascope::test::lattice_catalogue;
using deviascope::test::ProcessResult;
using deviascope::test::run_into_out;
using deviascope::test::small_job;
using deviascope::test::TemporaryFolder;

namespace {

constexpr const char* quick = "effective_draws = 500\n";

/// A second survey on a catalogue of its own.
std::string second_survey(const std::string& catalogue) {
    return "[[survey]]\nname = \"gnomon\"\ncatalogue = \"" + catalogue +
           "\"\nframe = \"icrs\"\ncolumns = { lon = \"ra\", lat = \"dec\", flux = \"s\" }\n"
           "exclude = [ { below = -60.0, frame = \"icrs\" } ]\n" +
           bins(3.0, 7.0);
}

std::string two_surveys() {
    return small_job(bins(3.75, 6.0), quick) + second_survey("gnomon.csv");
}

nlohmann::json json_in(const std::filesystem::path& file) {
    std::ifstream stream(file);
    return nlohmann::json::parse(stream);
}

std::set<std::string> keys_of(const nlohmann::json& object) {
    std::set<std::string> keys;
    for (const auto& [key, value] : object.items()) keys.insert(key);
    return keys;
}

/// Every third line of a catalogue (header kept).
std::string third_of(const std::string& catalogue) {
    std::istringstream in(catalogue);
    std::string out, line;
    for (int n = 0; std::getline(in, line); ++n)
        if (n % 3 == 0) out += line + "\n";
    return out;
}

}  // namespace

TEST_CASE("compare answers a referee's questions from the job file", "[app]") {
    const TemporaryFolder folder;
    folder.write("binnacle.csv", lattice_catalogue(20000));
    folder.write("gnomon.csv", lattice_catalogue(15001));
    folder.write("job.toml",
                 two_surveys() +
                     "[[hypothesis]]\nname = \"still\"\n"
                     "velocity = { prior = \"no-motion\" }\n");
    const ProcessResult first =
        run_into_out(folder, "compare", {"--clustering", "clustering-modest"});
    INFO(first.err);
    REQUIRE(first.exit_code == 0);
    const nlohmann::json found = json_in(folder / "out" / "compare.json");
    CHECK(found["schema"] == 1);
    CHECK(found["reference"]["name"] == "cmb-velocity");
    for (const char* key : {"chi2", "sigma", "angle_deg", "speed_ratio"})
        CHECK(found["reference"]["offset"].contains(key));
    REQUIRE(found["hypotheses"].size() == 5);
    CHECK(found["hypotheses"][0]["name"] == "reference");
    CHECK(found["hypotheses"][4]["name"] == "still");
    for (const auto& one : found["hypotheses"]) {
        INFO(one.dump());
        const auto& evidence = one["ln_evidence"];
        CHECK(std::abs(evidence["bridge"].get<double>() -
                       evidence["importance"].get<double>()) < 0.1);
        if (!evidence["savage_dickey"].is_null())
            CHECK(std::abs(evidence["bridge"].get<double>() -
                           evidence["savage_dickey"].get<double>()) < 0.15);
    }
    CHECK(found["hypotheses"][0]["nested_in"].is_string());
    CHECK(found["hypotheses"][3]["prior_width"].size() == 4);
    CHECK(found["surveys"]["alone"].size() == 2);
    CHECK(found["surveys"]["leave-one-out"].size() == 2);
    CHECK(found["surveys"]["pairs"].size() == 1);
    REQUIRE(found["fit"].size() == 4);
    CHECK(keys_of(found["fit"][0]).contains("dispersion"));
    CHECK(keys_of(found["fit"][0]).contains("p"));
    // A lattice is far more even than chance.
    CHECK(found["fit"][0]["dispersion"].get<double>() < 0.8);
    CHECK(found["overlap"][0]["surveys"] == nlohmann::json::array({"binnacle", "gnomon"}));
    CHECK(found["intrinsic_at_reference"].size() == 3);
    CHECK_THAT(first.out, Contains("under-dispersed"));
    CHECK_THAT(test::bytes_of(folder / "out" / "compare.csv"),
               Contains("hypotheses,free,bridge,"));

    SECTION("nothing existing is overwritten without --replace") {
        const ProcessResult second = run_into_out(folder, "compare");
        CHECK(second.exit_code == 5);
        CHECK_THAT(second.err, Contains("compare.json"));

        REQUIRE(run_into_out(folder, "run", {"--quiet", "--replace"}).exit_code == 0);
        const auto draw = [&](const char* only) {
            return test::run_process({DEVIASCOPE_PROGRAM,
                                      "figures",
                                      (folder / "out" / "chains.h5").string(),
                                      "--only",
                                      only});
        };
        CHECK(draw("hypotheses,surveys").exit_code == 0);
        CHECK_THAT(test::bytes_of(folder / "out" / "figures" / "hypotheses.svg"),
                   Contains("still"));
        CHECK_THAT(test::bytes_of(folder / "out" / "figures" / "data" / "surveys.csv"),
                   Contains("gnomon alone,speed,km/s,"));
        // A comparison of other inputs is not drawn.
        folder.write("gnomon.csv", lattice_catalogue(15003));
        REQUIRE(run_into_out(folder, "run", {"--quiet", "--replace"}).exit_code == 0);
        const ProcessResult other = draw("traces");
        CHECK(other.exit_code == 0);
        CHECK_THAT(other.err, Contains("of another job or other inputs"));
    }
    SECTION("the same bits again, with another number of threads; doubtful with --strict") {
        const std::string before = test::bytes_of(folder / "out" / "compare.json");
        const ProcessResult again = run_into_out(
            folder,
            "compare",
            {"--clustering", "clustering-modest", "--replace", "--threads", "1", "--strict"});
        CHECK(again.exit_code == 6);
        CHECK(test::bytes_of(folder / "out" / "compare.json") == before);
    }
}

TEST_CASE("compare refuses a reference that is none", "[app]") {
    const TemporaryFolder folder;
    folder.write("binnacle.csv", lattice_catalogue(2000));
    folder.write("job.toml", small_job(bins(3.75, 6.0), quick));
    const ProcessResult kind =
        run_into_out(folder, "compare", {"--reference", "free-velocity"});
    CHECK(kind.exit_code == 2);
    CHECK_THAT(kind.err, Contains("uniform-vector") && Contains("measured-velocity"));
    const ProcessResult name = run_into_out(folder, "compare", {"--reference", "cmb-velocty"});
    CHECK(name.exit_code == 2);
    CHECK_THAT(name.err, Contains("cmb-velocty"));
    CHECK(run_into_out(folder, "compare", {"--clustering", "none-such"}).exit_code == 2);
}

TEST_CASE("sources in common are reported, and dropped where the job says so", "[app]") {
    const TemporaryFolder folder;
    const std::string catalogue = lattice_catalogue(6000);
    folder.write("binnacle.csv", catalogue);
    folder.write("gnomon.csv",
                 third_of(catalogue) + "200.0,-75.0,1.5\n120.00371,5.00213,3.0\n");
    folder.write("job.toml", two_surveys());
    const ProcessResult plain = run_into_out(folder, "compare", {"--quiet"});
    INFO(plain.err);
    REQUIRE(plain.exit_code == 0);
    const nlohmann::json before = json_in(folder / "out" / "compare.json");
    const auto gnomon_sources = [](const nlohmann::json& summary) {
        return summary["bins"][2]["sources"].get<int>() +
               summary["bins"][3]["sources"].get<int>();
    };
    const int matches = before["overlap"][0]["matches"].get<int>();
    CHECK(matches > 1500);

    std::string job = two_surveys();
    job.insert(job.find("[velocity]"),
               "deduplicate = [\"gnomon over binnacle\"]\nmatch_arcsec = 2.0\n");
    folder.write("job.toml", job);
    const ProcessResult dropped = run_into_out(folder, "run", {"--replace"});
    INFO(dropped.err);
    REQUIRE(dropped.exit_code == 0);
    CHECK_THAT(dropped.out, Contains("in gnomon too, within 2 arcsec"));
    const nlohmann::json summary = json_in(folder / "out" / "summary.json");
    CHECK(summary["bins"][0]["sources"].get<int>() + summary["bins"][1]["sources"].get<int>() ==
          6000 - matches);
    CHECK(gnomon_sources(summary) == matches + 1);
}

TEST_CASE("a dispersion is measured in one go, and kept with the chain", "[app]") {
    const TemporaryFolder folder;
    // Every source twelve times over, at the same place: twelve times the dispersion of the
    // lattice's own.
    std::string rows = lattice_catalogue(20000);
    const std::string body = rows.substr(rows.find('\n') + 1);
    for (int copy = 1; copy < 12; ++copy) rows += body;
    folder.write("binnacle.csv", rows);
    std::string weights = bins(3.75, 6.0);
    weights.insert(weights.find("[[survey.bin]]", 5), "dispersion = \"measure\"\n");
    folder.write("job.toml", small_job(weights, quick));
    const ProcessResult first = run_into_out(folder, "run");
    INFO(first.err);
    REQUIRE(first.exit_code == 0);
    CHECK_THAT(first.out, Contains("Dispersion of binnacle/faint"));
    const Chain chain = read_chain(folder / "out" / "chains.h5");
    const auto& kept = chain.provenance.companions;
    const auto measured = std::find_if(kept.begin(), kept.end(), [](const Companion& one) {
        return one.name == "measured-dispersion.toml";
    });
    REQUIRE(measured != kept.end());
    CHECK_THAT(measured->text, Contains("bin = \"faint\"") && !Contains("bright"));

    SECTION("the chain alone gives the same summary") {
        std::filesystem::copy(folder / "out" / "chains.h5", folder / "chains.h5");
        REQUIRE(
            test::run_process(
                {DEVIASCOPE_PROGRAM, "summarise", (folder / "chains.h5").string(), "--quiet"})
                .exit_code == 0);
        CHECK(json_in(folder / "summary.json") == json_in(folder / "out" / "summary.json"));
    }
    SECTION("compare finds nothing left to mend in that bin") {
        REQUIRE(run_into_out(folder, "compare", {"--quiet"}).exit_code == 0);
        const nlohmann::json found = json_in(folder / "out" / "compare.json");
        const auto& faint = found["fit"][0];
        CHECK(faint["assumed_dispersion"].get<double>() ==
              Approx(faint["dispersion"].get<double>()).epsilon(0.01));
        // And figures know it for a comparison of the same job, measured dispersion and all.
        const ProcessResult drawn = test::run_process({DEVIASCOPE_PROGRAM,
                                                       "figures",
                                                       (folder / "out" / "chains.h5").string(),
                                                       "--only",
                                                       "hypotheses"});
        CHECK(drawn.exit_code == 0);
        CHECK(drawn.err == "");
    }
}

TEST_CASE("sweep runs the job again with other cuts, one row each", "[app]") {
    const TemporaryFolder folder;
    folder.write("binnacle.csv", lattice_catalogue(20000));
    std::string job = small_job(bins(3.75, 6.0), quick);
    job.insert(job.find("[[survey.bin]]"),
               "exclude = [ { band = 10.0, frame = \"galactic\" } ]\n");
    folder.write("job.toml", job);
    const ProcessResult result = run_into_out(folder,
                                              "sweep",
                                              {"--vary",
                                               "survey.binnacle.exclude.band=20:40:20",
                                               "--vary",
                                               "velocity.prior=cmb-velocity",
                                               "--vary",
                                               "job.nside=4,16"});
    INFO(result.err);
    REQUIRE(result.exit_code == 0);
    const nlohmann::json found = json_in(folder / "out" / "sweep.json");
    CHECK(found["schema"] == 1);
    REQUIRE(found["rows"].size() == 6);
    CHECK(found["rows"][0]["path"].is_null());
    CHECK(found["rows"][1]["value"] == "20");
    CHECK(found["rows"][2]["sources"].get<int>() < found["rows"][1]["sources"].get<int>());
    CHECK(found["rows"][2]["difference"]["sigma"].is_number());
    CHECK(found["rows"][0]["difference"]["sigma"].is_null());
    CHECK(found["rows"][3]["speed_km_s"]["median"].get<double>() ==
          Approx(369.8).epsilon(0.01));
    CHECK_THAT(test::bytes_of(folder / "out" / "sweep.csv"), Contains("job.nside,16,"));
    CHECK_THAT(result.out, Contains("survey.binnacle.exclude.band = 40"));

    SECTION("a path that leads nowhere is refused before anything runs") {
        const ProcessResult lost = run_into_out(
            folder, "sweep", {"--replace", "--vary", "survey.bincale.exclude.band=1"});
        CHECK(lost.exit_code == 2);
        CHECK_THAT(lost.err, Contains("survey.bincale.exclude.band"));
    }
    SECTION("a value that no job can have is refused by the job's own rules") {
        const ProcessResult wrong =
            run_into_out(folder, "sweep", {"--replace", "--vary", "job.nside=12"});
        CHECK(wrong.exit_code == 2);
        CHECK_THAT(wrong.err, Contains("power of two"));
    }
}
