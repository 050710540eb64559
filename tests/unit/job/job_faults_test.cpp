// SPDX-License-Identifier: GPL-2.0-or-later
// Every rule of the schema: a change to a sound job, and all that is said about it.
#include <catch2/catch.hpp>
#include <string>

#include "plain_job.h"

using namespace deviascope;

namespace {

struct Case {
    const char* from;
    const char* to;
    const char* faults;  ///< without the leading "j.toml:"
};

void check(const std::string& job, const std::vector<Case>& cases) {
    REQUIRE(faults_of(job).empty());
    for (const Case& c : cases) {
        INFO(c.from << "  ->  " << c.to);
        CHECK(faults_of(with(job, c.from, c.to)) == std::string("j.toml:") + c.faults);
    }
}

}  // namespace

TEST_CASE("faults of the table job are named", "[job]") {
    check(
        plain_job,
        {
            {"seed = 1", "", "1:1: job.seed: missing; an integer of at least 0 is required"},
            {"seed = 1",
             "seed = -1",
             "2:8: job.seed: found -1; an integer of at least 0 is allowed"},
            {"seed = 1",
             "seed = 1.0",
             "2:8: job.seed: found 1.0; an integer of at least 0 is allowed"},
            {"seed = 1",
             "sede = 1",
             "1:1: job.seed: missing; an integer of at least 0 is required\n"
             "j.toml:2:1: job.sede: unknown key; known here: \"title\", \"seed\", \"nside\", "
             "\"frame\", \"deduplicate\", \"match_arcsec\"; did you mean \"seed\"?"},
            {"nside = 64",
             "",
             "1:1: job.nside: missing; a power of two from 1 to 1024 is required"},
            {"nside = 64",
             "nside = 60",
             "3:9: job.nside: found 60; a power of two from 1 to 1024 is allowed"},
            {"nside = 64",
             "nside = 2048",
             "3:9: job.nside: found 2048; a power of two from 1 to 1024 is allowed"},
            {"nside = 64",
             "nside = 64\nframe = 'galatic'",
             "4:9: job.frame: found \"galatic\"; \"galactic\", \"icrs\" or \"ecliptic\" is "
             "allowed; did you mean \"galactic\"?"},
            {"nside = 64",
             "nside = 64\ntitle = 7",
             "4:9: job.title: found 7; a text that is not empty is allowed"},
            {"nside = 64",
             "nside = 64\ndeduplicate = ['dunlin over lantern']\nmatch_arcsec = 0.0",
             "4:15: job.deduplicate: found \"dunlin over lantern\"; texts of the form \"dunlin "
             "over lantern\", two surveys of the job, are allowed\n"
             "j.toml:5:16: job.match_arcsec: found 0.0; a number above 0 and at most 3600 is "
             "allowed"},
            {"[velocity]",
             "[outlook]\n[velocity]",
             "4:2: outlook: unknown key; known here: \"job\", \"monopole\", \"velocity\", "
             "\"intrinsic\", \"survey\", \"ensemble\", \"hypothesis\""},
        });
}

TEST_CASE("faults of the table priors are named", "[job]") {
    const char* const prior = "prior = { kind = \"uniform-vector\", max = 0.05 }";
    const char* const kind = "kind = \"uniform-vector\", max = 0.05";
    check(
        plain_job,
        {
            {prior,
             "",
             "4:1: velocity.prior: missing; the name of a prior or a table { kind = … } is "
             "required"},
            {prior,
             "prior = 0.05",
             "5:9: velocity.prior: found 0.05; the name of a prior or a table { kind = … } is "
             "allowed"},
            {prior,
             "prior = 'free-velocty'",
             "5:9: velocity.prior: found \"free-velocty\"; a known prior is allowed"},
            {prior,
             "prior = 'priors/free-velocity.toml'",
             "5:9: velocity.prior: found \"priors/free-velocity.toml\"; the name of a prior, "
             "without folder and .toml, is allowed; put the file beside the job or into its "
             "priors/"},
            {kind,
             "max = 0.05",
             "5:9: velocity.prior.kind: missing; \"uniform-vector\", \"uniform-amplitude\", "
             "\"gaussian\", \"measured-velocity\", \"axis\" or \"fixed\" is required"},
            {kind,
             "kind = 'uniform-vektor', sd = 1",
             "5:18: velocity.prior.kind: found \"uniform-vektor\"; \"uniform-vector\", "
             "\"uniform-amplitude\", \"gaussian\", \"measured-velocity\", \"axis\" or "
             "\"fixed\" is allowed; did you mean \"uniform-vector\"?"},
            {kind,
             "kind = 'uniform-vector', max = 1.5",
             "5:42: velocity.prior.max: found 1.5; a number above 0 and at most 1 is allowed"},
            {kind,
             "kind = 'uniform-vector', max = 0",
             "5:42: velocity.prior.max: found 0; a number above 0 and at most 1 is allowed"},
            {kind,
             "kind = 'uniform-vector', max = 0.05, sd = 0.1",
             "5:48: velocity.prior.sd: unknown key; known here: \"kind\", \"source\", \"max\""},
            {kind,
             "kind = 'uniform-amplitude'",
             "5:9: velocity.prior.max: missing; a number above 0 and at most 1 is required"},
            {kind,
             "kind = 'gaussian'",
             "5:9: velocity.prior.sd: missing; sd, or mean and covariance, is required"},
            {kind,
             "kind = 'gaussian', sd = 0",
             "5:35: velocity.prior.sd: found 0; a finite number above 0 is allowed"},
            {kind,
             "kind = 'gaussian', sd = 0.1, mean = [0, 0, 0]",
             "5:47: velocity.prior.mean: given besides sd, which stands for mean 0; leave one "
             "of them out"},
            {kind,
             "kind = 'gaussian', mean = [0, 0, 0]",
             "5:9: velocity.prior.covariance: missing; an array of 3 rows of 3 finite numbers "
             "is required"},
            {kind,
             "kind = 'gaussian', mean = [0.8, 0.8, 0], covariance = [[1, 0, 0], [0, 1, 0], [0, "
             "0, 1]]",
             "5:37: velocity.prior.mean: found [0.8, 0.8, 0]; a vector shorter than 1 is "
             "allowed"},
            {kind,
             "kind = 'gaussian', mean = [0, 0], covariance = [[1, 0, 0], [0, 1, 0], [0, 0, 1]]",
             "5:37: velocity.prior.mean: found [0, 0]; an array of 3 finite numbers is "
             "allowed"},
            {kind,
             "kind = 'gaussian', mean = [0, 0, 0], covariance = [[1, 0, 0], [0.1, 1, 0], [0, "
             "0, 1]]",
             "5:61: velocity.prior.covariance: found [[1, 0, 0], [0.1, 1, 0], [0, 0, 1]]; a "
             "symmetric matrix is allowed"},
            {kind,
             "kind = 'gaussian', mean = [0, 0, 0], covariance = [[1, 2, 0], [2, 1, 0], [0, 0, "
             "1]]",
             "5:61: velocity.prior.covariance: found [[1, 2, 0], [2, 1, 0], [0, 0, 1]]; a "
             "positive definite matrix is allowed"},
            {kind,
             "kind = 'gaussian', mean = [0, 0, 0], covariance = [[1, 0, 0], [0, 1, 0], [0, 0, "
             "0]]",
             "5:61: velocity.prior.covariance: found [[1, 0, 0], [0, 1, 0], [0, 0, 0]]; a "
             "positive definite matrix is allowed"},
            {kind,
             "kind = 'axis', lon_deg = 10, lat_deg = 95, max = 0.1",
             "5:9: velocity.prior.frame: missing; \"galactic\", \"icrs\" or \"ecliptic\" is "
             "required\n"
             "j.toml:5:50: velocity.prior.lat_deg: found 95; a number of at least -90 and at "
             "most 90 is allowed"},
            {kind,
             "kind = 'fixed', value = [1, 0, 0]",
             "5:35: velocity.prior.value: found [1, 0, 0]; a vector shorter than 1 is allowed"},
            {kind,
             "kind = 'fixed', value = [nan, 0, 0]",
             "5:35: velocity.prior.value: found [nan, 0, 0]; an array of 3 finite numbers is "
             "allowed"},
            {kind,
             "kind = 'measured-velocity', speed_km_s = 3e5, speed_sd_km_s = 0, lon_deg = 10, "
             "lon_sd_deg = 1, lat_deg = 90, lat_sd_deg = 1",
             "5:9: velocity.prior.frame: missing; \"galactic\", \"icrs\" or \"ecliptic\" is "
             "required\n"
             "j.toml:5:52: velocity.prior.speed_km_s: found 300000.0; a number above 0 and "
             "below 299792.458 is allowed\n"
             "j.toml:5:73: velocity.prior.speed_sd_km_s: found 0; a number above 0 and below "
             "299792.458 is allowed\n"
             "j.toml:5:116: velocity.prior.lat_deg: found 90; a number above -90 and below 90 "
             "is allowed"},
            {"prior = { kind = \"gaussian\", sd = 0.01 }",
             "shared = 1",
             "6:1: intrinsic.prior: missing; the name of a prior or a table { kind = … } is "
             "required\n"
             "j.toml:7:10: intrinsic.shared: found 1; true or false is allowed"},
            {"[intrinsic]",
             "[monopole]\nprior = { kind = 'gamma', shape = 0 }\nsample = 'no'\n[intrinsic]",
             "7:9: monopole.prior.rate: missing; a finite number above 0 is required\n"
             "j.toml:7:35: monopole.prior.shape: found 0; a finite number above 0 is allowed\n"
             "j.toml:8:10: monopole.sample: found \"no\"; true or false is allowed"},
            {"[intrinsic]",
             "[monopole]\nprior = { kind = 'uniform', shape = 1 }\n[intrinsic]",
             "7:29: monopole.prior.shape: unknown key; known here: \"kind\""},
            {"[intrinsic]",
             "[monopole]\nprior = 'uniform'\n[intrinsic]",
             "7:9: monopole.prior: found \"uniform\"; a table is allowed"},
        });
}

TEST_CASE("faults of the table ensemble are named", "[job]") {
    check(plain_job + "[ensemble]\nwalkers = 36\n",
          {
              {"walkers = 36",
               "walkers = 35",
               "22:11: ensemble.walkers: found 35; an even number of at least 18 (twice the 8 "
               "coordinates, plus 2) is allowed"},
              {"walkers = 36",
               "walkers = 16",
               "22:11: ensemble.walkers: found 16; an even number of at least 18 (twice the 8 "
               "coordinates, plus 2) is allowed"},
              {"walkers = 36",
               "engine = 'pixle'",
               "22:10: ensemble.engine: found \"pixle\"; \"auto\", \"moment\" or \"pixel\" is "
               "allowed; did you mean \"pixel\"?"},
              {"walkers = 36",
               "tolerance = 0",
               "22:13: ensemble.tolerance: found 0; a finite number above 0 is allowed"},
              {"walkers = 36",
               "replicates = 0",
               "22:14: ensemble.replicates: found 0; an integer from 1 to 10000 is allowed"},
              {"walkers = 36",
               "effective_draws = 0.5",
               "22:19: ensemble.effective_draws: found 0.5; a finite number of at least 1 is "
               "allowed"},
              {"walkers = 36",
               "max_steps = 1",
               "22:13: ensemble.max_steps: found 1; an integer from 2 to 1000000000000 is "
               "allowed"},
              {"walkers = 36",
               "store_every = -1",
               "22:15: ensemble.store_every: found -1; an integer from 0 to 1000000000000 is "
               "allowed"},
              {"walkers = 36",
               "store_every = 200001",
               "22:15: ensemble.store_every: found 200001; 0, or at most max_steps (200000) is "
               "allowed"},
              {"walkers = 36",
               "kernels = { stretch = 0.4, differential-evolution = 0.5 }",
               "22:11: ensemble.kernels: the fractions add to 0.9; fractions that add to 1 are "
               "allowed; a kernel left out has fraction 0"},
              {"walkers = 36",
               "kernels = { stretch = 1.5, differential-evolution = -0.5 }",
               "22:23: ensemble.kernels.stretch: found 1.5; a number of at least 0 and at most "
               "1 is allowed\n"
               "j.toml:22:53: ensemble.kernels.differential-evolution: found -0.5; a number of "
               "at least 0 and at most 1 is allowed"},
              {"walkers = 36",
               "kernels = { strech = 1.0 }",
               "22:11: ensemble.kernels: the fractions add to 0; fractions that add to 1 are "
               "allowed; a kernel left out has fraction 0\n"
               "j.toml:22:13: ensemble.kernels.strech: unknown key; known here: \"stretch\", "
               "\"differential-evolution\", \"independence\"; did you mean \"stretch\"?"},
          });
}

TEST_CASE("faults of the table survey are named", "[job]") {
    const char* const frame = "frame = \"icrs\"";
    const std::string added = std::string(frame) + "\n";
    const auto plus = [&](const char* line) { return added + line; };
    const std::string lines[] = {
        plus("exclude = [{ band = 15.0 }]"),
        plus("exclude = [{ frame = 'icrs' }]"),
        plus("exclude = [{ band = 15.0, below = -40, frame = 'icrs' }]"),
        plus("exclude = [{ lon = 83.6, radius = 1.5, frame = 'icrs' }]"),
        plus("exclude = [{ band = 90, frame = 'icrs' }, { above = 'x', frame = 'icrs' }]"),
        plus("exclude = { band = 15.0, frame = 'icrs' }"),
        plus("select = { flux = [20, 10] }"),
        plus("select = { flux = [20, 20] }"),
        plus("select = { flux = 20 }"),
        plus("select = { fluks = [10, 20], lon = [0, 1] }"),
        plus("scatter = { redshift = '0.05*(1-z)', size = 1, flux = -0.1 }"),
        plus("alpha = { mean = 0.75 }"),
        plus("table = -1"),
        plus("bad_rows = 'drop'"),
        plus("map_frame = 'equatorial'"),
        plus("prior = { kind = 'gaussian' }"),
        plus("weights = 'dunlin-weights.toml'"),
    };
    const char* const faults[] = {
        "12:12: survey[1].exclude[1].frame: missing; \"galactic\", \"icrs\" or \"ecliptic\" is "
        "required",
        "12:12: survey[1].exclude[1]: no region; one of band; lon, lat and radius; below; "
        "above is required",
        "12:12: survey[1].exclude[1]: more than one region; one of band; lon, lat and radius; "
        "below; above is required; write one table for each",
        "12:12: survey[1].exclude[1].lat: missing; a number of at least -90 and at most 90 is "
        "required",
        "12:21: survey[1].exclude[1].band: found 90; a number above 0 and below 90 is allowed\n"
        "j.toml:12:53: survey[1].exclude[2].above: found \"x\"; a number above -90 and below "
        "90 is allowed",
        "12:11: survey[1].exclude: found a table; an array of tables, [[survey.exclude]], is "
        "allowed",
        "12:19: survey[1].select.flux: found [20, 10]; a range [low, high) with low below high "
        "is allowed",
        "12:19: survey[1].select.flux: found [20, 20]; a range [low, high) with low below high "
        "is allowed",
        "12:19: survey[1].select.flux: found 20; an array of 2 numbers or inf is allowed",
        "12:20: survey[1].select.fluks: no such property; the survey's columns name \"flux\" "
        "and \"redshift\"\n"
        "j.toml:12:36: survey[1].select.lon: no such property; the survey's columns name "
        "\"flux\" and \"redshift\"",
        "12:24: survey[1].scatter.redshift: found \"0.05*(1-z)\"; a number or the form "
        "\"0.05*(1+z)\" is allowed\n"
        "j.toml:12:45: survey[1].scatter.size: no such property; the survey's columns name "
        "\"flux\" and \"redshift\"\n"
        "j.toml:12:55: survey[1].scatter.flux: found -0.1; a finite number of at least 0 is "
        "allowed",
        "12:9: survey[1].alpha.sd: missing; a finite number of at least 0 is required",
        "12:9: survey[1].table: found -1; an integer from 0 to 2147483647 is allowed",
        "12:12: survey[1].bad_rows: found \"drop\"; \"stop\" or \"skip\" is allowed",
        "12:13: survey[1].map_frame: found \"equatorial\"; \"galactic\", \"icrs\" or "
        "\"ecliptic\" is allowed",
        "12:9: survey[1].prior.sd: missing; sd, or mean and covariance, is required",
        "12:11: survey[1].weights: there is no file \"dunlin-weights.toml\"; a readable file "
        "whose name ends in .toml is allowed; relative paths start at the job file's folder"};
    std::vector<Case> cases;
    for (std::size_t i = 0; i < std::size(lines); ++i) {
        cases.push_back({frame, lines[i].c_str(), faults[i]});
    }
    check(plain_job, cases);
    check(plain_job,
          {
              {frame,
               "",
               "8:1: survey[1].frame: missing; \"galactic\", \"icrs\" or \"ecliptic\" is "
               "required"},
              {"name = \"dunlin\"",
               "name = \"all\"",
               "9:8: survey[1].name: found \"all\"; any name but \"all\", \"joint\" or "
               "\"velocity\" is "
               "allowed"},
              {"name = \"dunlin\"",
               "name = \"Dunlin\"",
               "9:8: survey[1].name: found \"Dunlin\"; a name of the characters a-z, 0-9 and - "
               "is allowed"},
              {"name = \"dunlin\"",
               "",
               "8:1: survey[1].name: missing; a text that is not empty is required"},
              {"lon = \"RA\", lat = \"DEC\"",
               "lon = \"RA\"",
               "12:11: survey[1].columns.lat: missing; a text that is not empty is required"},
              {"lat = \"DEC\"",
               "lat = \"RA\"",
               "12:31: survey[1].columns.lat: found \"RA\"; each column once is allowed; it is "
               "lon already"},
              {"catalogue = \"dunlin.fits\"",
               "catalogue = []",
               "10:13: survey[1].catalogue: found []; a text or an array of texts is allowed"},
              {"catalogue = \"dunlin.fits\"",
               "catalogue = ['a.fits', 'b.fits', 'a.fits']",
               "10:13: survey[1].catalogue: \"a.fits\" is named twice; each file once is "
               "allowed; its sources would count twice"},
              {"catalogue = \"dunlin.fits\"",
               "",
               "15:10: survey[1].bin[1].select: the survey has no catalogue; select needs one; "
               "or give counts\n"
               "j.toml:19:10: survey[1].bin[2].select: the survey has no catalogue; select "
               "needs one; or give counts"},
              {"[[survey]]",
               "[survey]",
               "8:1: survey: found a table; an array of tables, [[survey]], is allowed"},
          });
}

TEST_CASE("faults of the table survey.bin are named", "[job]") {
    check(
        plain_job,
        {
            {"name = \"bright\"",
             "name = \"faint\"",
             "18:8: survey[1].bin[2].name: found \"faint\"; each name once is allowed; it is "
             "taken in line 14; choose another"},
            {"name = \"bright\"",
             "name = \"very bright\"",
             "18:8: survey[1].bin[2].name: found \"very bright\"; a name of the characters "
             "a-z, 0-9 and - is allowed"},
            {"select = { flux = [10.0, 20.0] }",
             "",
             "13:1: survey[1].bin[1].select: missing; select (a table) or counts (a map) is "
             "required"},
            {"select = { flux = [10.0, 20.0] }",
             "select = { flux = [10.0, 20.0] }\ncounts = 'n.fits'",
             "16:10: survey[1].bin[1].counts: given besides select; one of select and counts "
             "is allowed"},
            {"select = { flux = [10.0, 20.0] }",
             "select = { magnitude = [10.0, 20.0] }",
             "15:24: survey[1].bin[1].select.magnitude: no such property; the survey's columns "
             "name \"flux\" and \"redshift\""},
            {"weight = { mean = 3.75, sd = 0.05 }",
             "",
             "13:1: survey[1].bin[1].weight: missing; a table { mean, sd } or { x, x_sd, "
             "alpha, alpha_sd } is required; or name a weights file in the survey's weights, "
             "or write \"measure\" there"},
            {"weight = { mean = 3.75, sd = 0.05 }",
             "weight = 3.75",
             "16:10: survey[1].bin[1].weight: found 3.75; a table { mean, sd } or { x, x_sd, "
             "alpha, alpha_sd } is allowed"},
            {"weight = { mean = 3.75, sd = 0.05 }",
             "weight = 'measure'",
             "16:10: survey[1].bin[1].weight: found \"measure\"; a table { mean, sd } or { x, "
             "x_sd, "
             "alpha, alpha_sd } is allowed; leave it out, and write weights = \"measure\" in "
             "the survey"},
            {"weight = { mean = 3.75, sd = 0.05 }",
             "weight = {}",
             "16:10: survey[1].bin[1].weight: no weight; a table { mean, sd } or { x, x_sd, "
             "alpha, alpha_sd } is required"},
            {"weight = { mean = 3.75, sd = 0.05 }",
             "weight = { mean = 3.75 }",
             "16:10: survey[1].bin[1].weight.sd: missing; a finite number of at least 0 is "
             "required"},
            {"weight = { mean = 3.75, sd = 0.05 }",
             "weight = { mean = 3.75, sd = -0.05 }",
             "16:30: survey[1].bin[1].weight.sd: found -0.05; a finite number of at least 0 is "
             "allowed"},
            {"weight = { mean = 3.75, sd = 0.05 }",
             "weight = { mean = 3.75, sd = 0.05, x = 1 }",
             "16:10: survey[1].bin[1].weight: both forms of a weight; a table { mean, sd } or "
             "{ x, x_sd, alpha, alpha_sd } is allowed; leave one of them out"},
            {"weight = { mean = 3.75, sd = 0.05 }",
             "weight = { x = 1.1, alpha = 0.75, x_sd = 0.05 }",
             "16:10: survey[1].bin[1].weight.alpha_sd: missing; a finite number of at least 0 "
             "is required"},
            {"weight = { mean = 3.75, sd = 0.05 }",
             "weight = { mean = 3.75, sd = 0.05 }\nbias = -1\ndispersion = 0",
             "17:8: survey[1].bin[1].bias: found -1; a finite number of at least 0 is allowed\n"
             "j.toml:18:14: survey[1].bin[1].dispersion: found 0; a finite number above 0 is "
             "allowed"},
            {"weight = { mean = 3.75, sd = 0.05 }",
             "weight = { mean = 3.75, sd = 0.05 }\ndispersion = 'measured'",
             "17:14: survey[1].bin[1].dispersion: found \"measured\"; a finite number above 0 "
             "is "
             "allowed"},
            {"weight = { mean = 3.75, sd = 0.05 }",
             "weight = { mean = 3.75, sd = 0.05 }\nbiass = 1",
             "17:1: survey[1].bin[1].biass: unknown key; known here: \"name\", \"select\", "
             "\"counts\", \"exposure\", \"bias\", \"dispersion\", \"weight\"; did you mean "
             "\"bias\"?"},
        });
}

TEST_CASE("faults of the table hypothesis are named", "[job]") {
    const std::string job = plain_job +
                            "[[hypothesis]]\nname = 'still'\nvelocity = { prior = 'no-motion' "
                            "}\nintrinsic = { prior = 'free-intrinsic' }\n"
                            "[[hypothesis]]\nname = 'moving'\n";
    check(job,
          {
              {"name = 'moving'",
               "name = 'still'",
               "26:8: hypothesis[2].name: found \"still\"; each name once is allowed; it is "
               "taken in line 22; choose another"},
              {"name = 'moving'",
               "name = 'free'",
               "26:8: hypothesis[2].name: found \"free\"; any name but \"reference\", "
               "\"reference-intrinsic\", \"free\" or \"free-intrinsic\" is allowed"},
              {"velocity = { prior = 'no-motion' }",
               "velocity = { prior = 'no-motoin' }",
               "23:22: hypothesis[1].velocity.prior: found \"no-motoin\"; a known prior is "
               "allowed"},
              {"velocity = { prior = 'no-motion' }",
               "velocity = { max = 1 }",
               "23:12: hypothesis[1].velocity.prior: missing; the name of a prior or a table { "
               "kind = … } is required\n"
               "j.toml:23:14: hypothesis[1].velocity.max: unknown key; known here: \"prior\""},
              {"velocity = { prior = 'no-motion' }",
               "velocity = 'no-motion'",
               "23:12: hypothesis[1].velocity: found \"no-motion\"; a table is allowed"},
              {"intrinsic = { prior = 'free-intrinsic' }",
               "monopole = { sample = true }",
               "24:1: hypothesis[1].monopole: unknown key; known here: \"name\", \"velocity\", "
               "\"intrinsic\""},
          });
}
