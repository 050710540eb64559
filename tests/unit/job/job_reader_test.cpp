// SPDX-License-Identifier: GPL-2.0-or-later
#include <catch2/catch.hpp>
#include <cmath>
#include <limits>
#include <string>
#include <vector>

#include "deviascope/core/digest.h"
#include "deviascope/model/parameter_space.h"
#include "full_job.h"
#include "job/ensemble_reader.h"
#include "plain_job.h"
#include "temporary_folder.h"

using namespace deviascope;

namespace {

CompanionFinder among(const std::vector<Companion>& companions) {
    return [companions](const std::string& name) -> std::optional<Companion> {
        for (const Companion& companion : companions) {
            if (companion.name == name) return companion;
        }
        return std::nullopt;
    };
}

const char* const data_files[] = {"dunlin-north.fits",
                                  "dunlin-south.fits",
                                  "dunlin-exposure.fits",
                                  "dunlin-faint-exposure.fits",
                                  "dunlin-bright-counts.fits"};

void write_data(const test::TemporaryFolder& folder) {
    for (const char* name : data_files) folder.write(name, name);
    folder.write("dunlin-weights.toml", dunlin_weights);
}

/// What a whole job says in one text, for comparing two readings.
std::string told(const Job& job) {
    return job.title + digest_of_inputs(job, std::vector<InputDigest>(job.inputs.size())) +
           std::to_string(job.seed) + job.model.velocity.name() +
           std::to_string(job.model.velocity.median_amplitude(1)) +
           std::to_string(n_coordinates_of(job.model)) +
           std::to_string(job.model.surveys[0].weights.mean.sum()) +
           std::to_string(job.model.surveys[0].weights.covariance.sum());
}

}  // namespace

TEST_CASE("the full example is refused only for the survey it lacks", "[job]") {
    CHECK(faults_of(full_job, with_weights) ==
          "j.toml:6:15: job.deduplicate: found \"dunlin over lantern\"; texts of the form "
          "\"dunlin over lantern\", two surveys of the job, are allowed");
}

TEST_CASE("every key of the full example arrives where it belongs", "[job]") {
    const Job job = parsed(available_job(), with_weights);
    CHECK(job.name == "j.toml");
    CHECK(job.title == "Dunlin and Lantern, joint");
    CHECK(job.text == available_job());
    CHECK(job.seed == 20260817);
    CHECK(job.ensemble.seed == 20260817);
    CHECK(job.nside == 64);
    CHECK(job.frame == Frame::galactic);
    CHECK(job.model.velocity.name() == "free-velocity");
    CHECK(std::get<UniformVectorPrior>(job.model.velocity.kind()).max == 0.05);
    CHECK_FALSE(job.model.intrinsic_shared);
    CHECK(job.model.monopole.shape == 0.0);
    CHECK(job.model.monopole.rate == 0.0);
    CHECK_FALSE(job.model.monopole.sampled);
    CHECK(job.ensemble.replicates == 4);
    CHECK(job.ensemble.walkers == 144);
    CHECK(job.ensemble.effective_draws == 10000);
    CHECK(job.ensemble.max_steps == 200000);
    CHECK(job.ensemble.store_every == 0);
    CHECK(job.ensemble.kernels.stretch == 0.25);
    CHECK(job.ensemble.kernels.differential_evolution == 0.75);
    CHECK(job.ensemble.kernels.independence == 0.0);

    REQUIRE(job.surveys.size() == 1);
    const SurveyInput& survey = job.surveys[0];
    CHECK(survey.name == "dunlin");
    CHECK(survey.catalogue ==
          std::vector<std::filesystem::path>{"dunlin-north.fits", "dunlin-south.fits"});
    CHECK(survey.table == "SOURCES");
    CHECK(survey.frame == Frame::icrs);
    CHECK(survey.columns.size() == 8);
    CHECK(survey.columns.at("colour") == "W12");
    CHECK(survey.exposure == "dunlin-exposure.fits");
    CHECK(survey.map_frame == Frame::galactic);
    REQUIRE(survey.exclude.size() == 3);
    CHECK(std::get<BandExclusion>(survey.exclude[0].region).half_width_deg == 15.0);
    CHECK(survey.exclude[0].frame == Frame::galactic);
    const auto& disc = std::get<DiscExclusion>(survey.exclude[1].region);
    CHECK(disc.lon_deg == 83.6);
    CHECK(disc.lat_deg == 22.0);
    CHECK(disc.radius_deg == 1.5);
    CHECK(survey.exclude[1].frame == Frame::icrs);
    CHECK(std::get<BelowExclusion>(survey.exclude[2].region).lat_deg == -40.0);
    REQUIRE(survey.select.size() == 1);
    CHECK(survey.select[0].property == "flux");
    CHECK(survey.select[0].low == 10.0);
    CHECK(survey.select[0].high == std::numeric_limits<double>::infinity());
    CHECK(survey.bad_rows == BadRows::stop);

    REQUIRE(survey.bins.size() == 2);
    CHECK(survey.bins[0].select.at(0).high == 20.0);
    CHECK(survey.bins[0].exposure == "dunlin-faint-exposure.fits");
    CHECK_FALSE(survey.bins[0].counts.has_value());
    CHECK(survey.bins[1].counts == "dunlin-bright-counts.fits");
    CHECK(survey.bins[1].select.empty());

    REQUIRE(job.model.surveys.size() == 1);
    const SurveyModel& model = job.model.surveys[0];
    CHECK(std::get<GaussianPrior>(model.intrinsic.kind()).covariance(1, 1) ==
          Approx(0.0004).epsilon(1e-15));
    CHECK(model.bins.size() == 2);
    CHECK(job.companions.size() == 4);  // three priors and the weights file
    CHECK(job.inputs.size() == 5);
}

TEST_CASE("what is left out takes the defaults of the schema", "[job]") {
    const Job job = parsed(plain_job);
    CHECK(job.title == "j.toml");
    CHECK(job.frame == Frame::galactic);
    CHECK(job.model.monopole.is_improper());
    CHECK(job.model.monopole.shape == 0.0);
    CHECK_FALSE(job.model.monopole.sampled);
    CHECK_FALSE(job.model.intrinsic_shared);
    CHECK(job.ensemble.replicates == 4);
    CHECK(job.ensemble.walkers == 0);
    CHECK(job.ensemble.effective_draws == 10000);
    CHECK(job.ensemble.max_steps == 200000);
    CHECK(job.ensemble.kernels.stretch == 0.2);
    CHECK(job.ensemble.kernels.differential_evolution == 0.3);
    CHECK(job.surveys[0].bad_rows == BadRows::stop);
    CHECK(job.model.surveys[0].bins[0].bias_ratio == 1.0);
    CHECK(job.model.surveys[0].bins[0].dispersion == 1.0);
    CHECK(std::get<GaussianPrior>(job.model.surveys[0].intrinsic.kind()).covariance(2, 2) ==
          Approx(1e-4).epsilon(1e-15));
    CHECK(job.warnings.empty());
    CHECK(parsed(with(plain_job, "seed = 1", "seed = 9223372036854775807")).seed ==
          9223372036854775807u);
    CHECK(parsed(with(plain_job,
                      "[survey.bin]]\nname = \"faint\"\nselect = { flux = [10.0, 20.0] }",
                      "[survey.bin]]\nname = \"all\"\nselect = {}"))
              .surveys[0]
              .bins[0]
              .select.empty());
}

TEST_CASE("monopole priors are Gamma densities", "[job]") {
    const auto monopole = [](const std::string& table) {
        return parsed(plain_job + "[monopole]\n" + table + "\n").model.monopole;
    };
    CHECK(monopole("prior = { kind = 'uniform' }").shape == 1.0);
    CHECK(monopole("prior = { kind = 'uniform' }").rate == 0.0);
    const MonopolePrior gamma =
        monopole("prior = { kind = 'gamma', shape = 2, rate = 0.5 }\nsample = true");
    CHECK(gamma.shape == 2.0);
    CHECK(gamma.rate == 0.5);
    CHECK(gamma.sampled);
}

TEST_CASE("a weight follows from slope and spectral index as published", "[job]") {
    // Ellis & Baldwin 1984, MNRAS 206, 377: amplitude [2 + x (1 + alpha)] beta. By hand:
    // 2 + 1.1 * 1.75 = 3.925; sd^2 = (1.75 * 0.05)^2 + (1.1 * 0.05)^2 = 0.01068125.
    const Job job =
        parsed(with(plain_job,
                    "weight = { mean = 4.0, sd = 0.05 }",
                    "weight = { x = 1.1, x_sd = 0.05, alpha = 0.75, alpha_sd = 0.05 }"));
    const WeightPrior& weights = job.model.surveys[0].weights;
    CHECK(weights.mean(0) == 3.75);
    CHECK(weights.mean(1) == Approx(3.925).epsilon(1e-14));
    CHECK(weights.covariance(0, 0) == Approx(0.0025).epsilon(1e-14));
    CHECK(weights.covariance(1, 1) == Approx(0.01068125).epsilon(1e-13));
    CHECK(weights.covariance(0, 1) == 0.0);
}

TEST_CASE("bins that quote one spectral index are warned of", "[job]") {
    const auto job_with = [](const std::string& faint_alpha, const std::string& alpha_sd) {
        const std::string form = "weight = { x = 1.1, x_sd = 0.05, alpha = ";
        std::string text = with(plain_job,
                                "weight = { mean = 3.75, sd = 0.05 }",
                                form + faint_alpha + ", alpha_sd = " + alpha_sd + " }");
        text = with(text,
                    "weight = { mean = 4.0, sd = 0.05 }",
                    form + "0.75, alpha_sd = " + alpha_sd + " }");
        return parsed(text).warnings;
    };
    CHECK(
        job_with("0.75", "0.05") ==
        std::vector<std::string>{
            "survey dunlin: bins faint, bright quote the same alpha 0.75 +- 0.05, so they "
            "share "
            "its error, but their weights are taken as independent; give the survey a weights "
            "file with their covariance"});
    CHECK(job_with("0.76", "0.05").empty());
    CHECK(job_with("0.75", "0").empty());
}

TEST_CASE("a bias that takes a fixed dipole beyond its wall is a fault of the job", "[job]") {
    const std::string fixed = with(plain_job,
                                   "{ kind = \"gaussian\", sd = 0.01 }",
                                   "{ kind = 'fixed', value = [0, 0, 0.5] }");
    const auto with_bias = [&](const std::string& text, const std::string& bias) {
        return faults_of(with(text,
                              "[[survey.bin]]\nname = \"bright\"",
                              "bias = " + bias + "\n[[survey.bin]]\nname = \"bright\""));
    };
    const std::string fault =
        "j.toml:17:8: survey[1].bin[1].bias: found 2.0; a number below 2, the inverse of the "
        "fixed intrinsic dipole, is allowed";
    CHECK(with_bias(fixed, "1.99").empty());
    CHECK(with_bias(fixed, "2.0") == fault);
    CHECK(with_bias(plain_job, "2.0").empty());
}

TEST_CASE("a fault that two readers meet is told once", "[job]") {
    CHECK(faults_of(with(plain_job, "lon = \"RA\"", "lon = 3")) ==
          "j.toml:12:19: survey[1].columns.lon: found 3; a text that is not empty is allowed");
}

TEST_CASE("a survey of count maps needs neither catalogue nor frame", "[job]") {
    std::string text = with(plain_job, "catalogue = \"dunlin.fits\"\nframe = \"icrs\"\n", "");
    text = with(text,
                "columns = { lon = \"RA\", lat = \"DEC\", flux = \"S\", redshift = \"Z\" }\n",
                "");
    text = with(text, "select = { flux = [10.0, 20.0] }", "counts = 'a.fits'");
    text = with(text, "select = { flux = [20.0, inf] }", "counts = 'b.fits'");
    CHECK(faults_of(text).empty());
    CHECK(parsed(text).inputs.size() == 2);
}

TEST_CASE("faults from everywhere in the file come together, in the order of lines", "[job]") {
    std::string text = with(plain_job, "seed = 1", "sede = 1");
    text = with(text, "max = 0.05", "max = 2");
    text = with(text, "sd = 0.01", "sd = -1");
    text = with(text, "name = \"dunlin\"", "name = \"all\"");
    text = with(text, "lat = \"DEC\", ", "");
    text = with(text, "[20.0, inf]", "[20.0, 20.0]");
    text = with(text, "sd = 0.05 }", "sd = nan }");
    text += "[ensemble]\nwalkers = 7\n";
    CHECK(
        faults_of(text) ==
        "j.toml:1:1: job.seed: missing; an integer of at least 0 is required\n"
        "j.toml:2:1: job.sede: unknown key; known here: \"title\", \"seed\", \"nside\", "
        "\"frame\", \"deduplicate\", \"match_arcsec\"; did you mean \"seed\"?\n"
        "j.toml:5:42: velocity.prior.max: found 2; a number above 0 and at most 1 is allowed\n"
        "j.toml:7:35: intrinsic.prior.sd: found -1; a finite number above 0 is allowed\n"
        "j.toml:9:8: survey[1].name: found \"all\"; any name but \"all\", \"joint\" or "
        "\"velocity\" is "
        "allowed\n"
        "j.toml:12:11: survey[1].columns.lat: missing; a text that is not empty is required\n"
        "j.toml:16:30: survey[1].bin[1].weight.sd: found nan; a finite number of at least 0 is "
        "allowed\n"
        "j.toml:19:19: survey[1].bin[2].select.flux: found [20.0, 20.0]; a range [low, high) "
        "with low below high is allowed\n"
        "j.toml:22:11: ensemble.walkers: found 7; an even number is allowed");
}

TEST_CASE("an own intrinsic prior is refused where all surveys share one vector", "[job]") {
    std::string text = with(plain_job, "[intrinsic]\n", "[intrinsic]\nshared = true\n");
    CHECK(faults_of(text).empty());
    text = with(text, "frame = \"icrs\"\n", "frame = \"icrs\"\nprior = 'free-intrinsic'\n");
    CHECK(faults_of(text) ==
          "j.toml:13:9: survey[1].prior: given although intrinsic.shared = true gives all "
          "surveys "
          "one vector; leave it out, or write shared = false");
}

TEST_CASE("the least number of walkers counts the coordinates as the model does", "[job]") {
    const auto agree = [](const Job& job) {
        Counts counts;
        counts.nside = job.nside;
        counts.frame = job.frame;
        for (const SurveyInput& survey : job.surveys) {
            SurveyCounts counted;
            counted.name = survey.name;
            for (const BinInput& bin : survey.bins) {
                counted.bins.emplace_back();
                counted.bins.back().name = bin.name;
            }
            counts.surveys.push_back(counted);
        }
        return ParameterSpace(counts, job.model).n_coordinates() == n_coordinates_of(job.model);
    };
    CHECK(agree(parsed(plain_job)));
    CHECK(n_coordinates_of(parsed(plain_job).model) == 3 + 3 + 2);
    const std::string constant =
        with(plain_job, "mean = 3.75, sd = 0.05", "mean = 3.75, sd = 0");
    CHECK(agree(parsed(constant)));
    CHECK(n_coordinates_of(parsed(constant).model) == 3 + 3 + 1);
    const Job shared = parsed(
        with(constant, "[intrinsic]", "[monopole]\nsample = true\n[intrinsic]\nshared = true"));
    CHECK(agree(shared));
    CHECK(n_coordinates_of(shared.model) == 3 + 3 + 1 + 2);
    const Job axis = parsed(with(plain_job,
                                 "kind = \"uniform-vector\"",
                                 "kind = 'axis', lon_deg = 0, lat_deg = 0, frame = 'icrs'"));
    CHECK(agree(axis));
    CHECK(n_coordinates_of(axis.model) == 1 + 3 + 2);
    const Job still = parsed(with(
        plain_job, "prior = { kind = \"uniform-vector\", max = 0.05 }", "prior = 'no-motion'"));
    CHECK(agree(still));
    CHECK(n_coordinates_of(still.model) == 3 + 2);
}

TEST_CASE("paths start at the job file's folder", "[job]") {
    const test::TemporaryFolder folder;
    write_data(folder);
    std::filesystem::create_directory(folder / "jobs");
    std::string text = available_job();
    for (const char* name : data_files) {
        text = with(text, std::string("\"") + name, std::string("\"../") + name);
    }
    text =
        with(text, "\"dunlin-weights.toml", "\"" + (folder / "dunlin-weights.toml").string());
    const Job job = read_job(folder.write("jobs/j.toml", text));
    CHECK(job.name == "j.toml");
    CHECK(job.folder == folder / "jobs");
    CHECK(job.surveys[0].catalogue[1] == folder / "jobs/../dunlin-south.fits");
    REQUIRE(job.inputs.size() == 5);
    CHECK(job.inputs[1].written == "../dunlin-south.fits");
    const auto digests = digests_of_inputs(job);
    REQUIRE(digests.size() == 5);
    CHECK(digests[1].path == "../dunlin-south.fits");
    CHECK(digests[1].bytes == 17);
    CHECK(digests[1].sha256 == digest_of("dunlin-south.fits"));
}

TEST_CASE("missing files are faults beside the others, with the path as tried", "[job]") {
    const test::TemporaryFolder folder;
    std::filesystem::create_directory(folder / "dunlin.fits");
    std::string text = with(plain_job, "nside = 64", "nside = 63");
    text = with(text,
                "frame = \"icrs\"",
                "frame = \"icrs\"\nexposure = \"/nowhere/e.fits\"\nweights = \"w.toml\"");
    text = with(text, "select = { flux = [20.0, inf] }", "counts = 'n.fits'");
    const std::string path = folder.write("j.toml", text).string();
    const std::string here = folder.path().string();
    const std::string file =
        "; a file that exists is allowed; relative paths start at the job file's folder";
    try {
        read_job(path);
        FAIL("the job has faults");
    } catch (const UsageError& error) {
        CHECK(error.what() ==
              path + ":3:9: job.nside: found 63; a power of two from 1 to 1024 is allowed\n" +
                  path + ":10:13: survey[1].catalogue: \"" + here +
                  "/dunlin.fits\" is not a file" + file + "\n" + path +
                  ":12:12: survey[1].exposure: \"/nowhere/e.fits\" does not exist" + file +
                  "\n" + path + ":13:11: survey[1].weights: there is no file \"" + here +
                  "/w.toml\"; a readable file whose name ends in .toml is allowed; relative "
                  "paths start at the job file's folder\n" +
                  path + ":21:10: survey[1].bin[2].counts: \"" + here +
                  "/n.fits\" does not exist" + file);
    }
    CHECK_THROWS_WITH(
        read_job(folder / "none.toml"),
        here +
            "/none.toml: cannot be read; a job file (TOML) is required; check the "
            "path and its permissions");
}

TEST_CASE("text and companions alone give the same job again", "[job]") {
    const test::TemporaryFolder folder;
    write_data(folder);
    const Job read = read_job(folder.write("j.toml", available_job()));
    const Job again = parse_job(read.text, read.name, among(read.companions));
    CHECK(told(again) == told(read));
    CHECK(again.companions.size() == read.companions.size());
    std::vector<Companion> fewer = read.companions;
    fewer.erase(fewer.begin());
    CHECK(faults_of(read.text, among(fewer)) ==
          "j.toml:8:9: velocity.prior: found \"free-velocity\"; a known prior is allowed");
}
