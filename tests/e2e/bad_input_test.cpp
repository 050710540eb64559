// SPDX-License-Identifier: GPL-2.0-or-later
// Bad input of every kind, through the built program: exit code and exact message. What is
// expected stands in expected/bad-input.txt, one entry a case: `== name`, `exit code`, the text
// on standard error (FOLDER for the folder of the case).
#include <unistd.h>

#include <algorithm>
#include <catch2/catch.hpp>
#include <cmath>
#include <fstream>
#include <functional>
#include <map>
#include <sstream>

#include "bad_input_files.h"
#include "run_process.h"
#include "temporary_folder.h"

using namespace deviascope;
using deviascope::test::TemporaryFolder;

namespace {

struct Expected {
    int exit_code = -1;
    std::string text;
};

std::map<std::string, Expected> read_expected() {
    std::ifstream file(DEVIASCOPE_TEST_DATA "/e2e/expected/bad-input.txt");
    std::map<std::string, Expected> table;
    Expected* entry = nullptr;
    for (std::string line; std::getline(file, line);) {
        if (line.starts_with("== ")) {
            entry = &table[line.substr(3)];
        } else if (entry != nullptr && entry->exit_code < 0) {
            entry->exit_code = std::stoi(line.substr(5));
        } else if (entry != nullptr) {
            entry->text += line + '\n';
        }
    }
    return table;
}

/// What a case is: files to make in a folder, and the command line, `FOLDER/` where it begins a
/// word.
struct Case {
    std::string name;
    std::function<void(const TemporaryFolder&)> make;
    std::vector<std::string> words = {"count", "FOLDER/job.toml"};
};

std::string replaced(std::string text, const std::string& from, const std::string& to) {
    for (std::size_t at = 0; (at = text.find(from, at)) != std::string::npos; at += to.size())
        text.replace(at, from.size(), to);
    return text;
}

test::ProcessResult run_case(const Case& one, const TemporaryFolder& folder) {
    std::vector<std::string> words;
    if (one.words.front() != "/bin/sh") words.push_back(DEVIASCOPE_PROGRAM);
    const bool writes =
        one.words[0] == "count" || one.words[0] == "sample" || one.words[0] == "run";
    for (const std::string& word : one.words)
        words.push_back(replaced(
            replaced(word, "FOLDER", folder.path().string()), "PROGRAM", DEVIASCOPE_PROGRAM));
    if (writes && std::ranges::find(one.words, "-o") == one.words.end()) {
        words.push_back("-o");
        words.push_back((folder / "out").string());
    }
    return test::run_process(words);
}

/// Runs all cases. @returns the entries of those that are not answered as expected, as they
/// would stand in the table
std::string other_answers(const std::vector<Case>& cases) {
    static const std::map<std::string, Expected> expected = read_expected();
    std::ostringstream others;
    for (const Case& one : cases) {
        const TemporaryFolder folder;
        one.make(folder);
        const test::ProcessResult result = run_case(one, folder);
        const auto found = expected.find(one.name);
        const Expected wanted = found == expected.end() ? Expected{} : found->second;
        const std::string text = replaced(result.err, folder.path().string(), "FOLDER");
        if (result.exit_code != wanted.exit_code || text != wanted.text)
            others << "== " << one.name << "\nexit " << result.exit_code << '\n' << text;
    }
    return others.str();
}

using test::bad_input::base_job;
using test::bad_input::sound_rows;
using test::bad_input::write_sound_inputs;

/// The sound job with one text replaced by another, and files that `make` writes beside it.
Case job_case(
    const std::string& name,
    const std::string& from,
    const std::string& to,
    const std::function<void(const TemporaryFolder&)>& make = [](const TemporaryFolder&) {}) {
    return {name, [from, to, make](const TemporaryFolder& folder) {
                write_sound_inputs(folder);
                make(folder);
                const std::string changed = replaced(base_job, from, to);
                REQUIRE(changed != base_job);
                folder.write("job.toml", changed);
            }};
}

/// The sound job with another catalogue.
Case rows_case(const std::string& name, const std::string& text) {
    return {name, [text](const TemporaryFolder& folder) {
                write_sound_inputs(folder);
                folder.write("dunlin.csv", text);
            }};
}

/// The sound job with a catalogue that `make` writes under the name `file`.
Case file_case(const std::string& name,
               const std::string& file,
               const std::function<void(const TemporaryFolder&)>& make,
               const std::string& table = "") {
    const std::string more = table.empty() ? "" : "\ntable = " + table;
    return job_case(name, "\"dunlin.csv\"", "\"" + file + "\"" + more, make);
}

/// The sound job with an exposure that `make` writes as exposure.fits.
Case exposure_case(const std::string& name,
                   const std::function<void(const TemporaryFolder&)>& make,
                   const std::string& more = "") {
    return job_case(name,
                    "frame = \"icrs\"\ncolumns",
                    "frame = \"icrs\"\nexposure = \"exposure.fits\"" + more + "\ncolumns",
                    make);
}

/// The sound job whose bin is a count map that `make` writes as counts.fits.
Case counts_case(const std::string& name,
                 const std::function<void(const TemporaryFolder&)>& make) {
    return job_case(name, "select = { flux = [1.0, 2.0] }", "counts = \"counts.fits\"", make);
}

}  // namespace

TEST_CASE("sound input is taken in every spelling that is met", "[app]") {
    const std::vector<std::string> spellings = {
        sound_rows(),
        "\xEF\xBB\xBF" + sound_rows(),                     // byte-order mark
        replaced(sound_rows(), "\n", "\r\n"),              // Windows line ends
        replaced(sound_rows(), "ra,dec,s", "RA , Dec,S"),  // other case, blanks
        sound_rows() + "\n\r\n",                           // empty lines at the end
        replaced(
            sound_rows(), "ra,dec,s\n", "ra,dec,s\n45,9," + std::string(1000000, ' ') + "1\n"),
    };
    for (const std::string& text : spellings) {
        const TemporaryFolder folder;
        write_sound_inputs(folder);
        folder.write("dunlin.csv", text);
        const auto result = run_case({"", {}}, folder);
        INFO(text.substr(0, 40) << result.err);
        CHECK(result.exit_code == 0);
        CHECK(result.err.empty());
    }
}

TEST_CASE("bad job files and command lines are answered exactly", "[app]") {
    const auto nothing = [](const TemporaryFolder&) {};
    const std::vector<Case> cases{
        {"no such job file", nothing},
        {"a folder as job file", nothing, {"count", "FOLDER"}},
        {"a job file that is no TOML",
         [](const TemporaryFolder& f) { f.write("job.toml", "[job\nseed = 1\n"); }},
        {"an empty job file", [](const TemporaryFolder& f) { f.write("job.toml", ""); }},
        {"a job file that is no UTF-8",
         [](const TemporaryFolder& f) { f.write("job.toml", "[job]\ntitle = \"\xff\"\n"); }},
        {"a catalogue as job file",
         [](const TemporaryFolder& f) { f.write("job.toml", sound_rows()); }},
        job_case("a key twice", "seed = 1\n", "seed = 1\nseed = 2\n"),
        job_case("an unknown key", "nside = 4", "nside = 4\nnsid = 8"),
        job_case("an unknown table", "[velocity]", "[ensembl]\n[velocity]"),
        job_case("no seed", "seed = 1\n", ""),
        job_case("a negative seed", "seed = 1\n", "seed = -1\n"),
        job_case("an nside that is no power of two", "nside = 4", "nside = 6"),
        job_case("an unknown frame", "frame = \"icrs\"\n[", "frame = \"irs\"\n["),
        job_case("an unknown prior", "\"free-velocity\"", "\"free-velocty\""),
        job_case("a prior of negative width", "sd = 0.05", "sd = -1"),
        job_case("a catalogue that is not there", "\"dunlin.csv\"", "\"dunlim.csv\""),
        job_case("an exposure that is not there",
                 "frame = \"icrs\"\ncolumns",
                 "frame = \"icrs\"\nexposure = \"none.fits\"\ncolumns"),
        job_case("a column twice", "flux = \"s\"", "flux = \"ra\""),
        job_case("a range upside down", "[1.0, 2.0]", "[2.0, 1.0]"),
        job_case("a property without column", "select = { flux", "select = { redshift"),
        job_case("a bin without weight", "weight = { mean = 3.75, sd = 0.1 }", ""),
        job_case("two bins of one name", "\"bright\"", "\"faint\""),
        job_case("a survey without bins", "[[survey.bin]]", "[[survey.bun]]"),
        job_case("several faults at once", "seed = 1\nnside = 4", "seed = 1.5\nnside = 0"),
        {"an unknown command", nothing, {"cuont", "FOLDER/job.toml"}},
        {"an unknown option", nothing, {"count", "FOLDER/job.toml", "--fast"}},
        {"no threads", nothing, {"count", "FOLDER/job.toml", "--threads", "0"}},
        {"no file named", nothing, {"check"}},
    };
    CHECK(other_answers(cases) == "");
}

TEST_CASE("bad catalogues are answered exactly", "[app]") {
    using namespace test::bad_input;
    const std::vector<Case> cases{
        rows_case("an empty file", ""),
        {"a catalogue without rows",
         [](const TemporaryFolder& folder) {
             write_sound_inputs(folder);
             folder.write("dunlin.csv", "ra,dec,s\n");
         },
         {"sample", "FOLDER/job.toml"}},
        rows_case("semicolons for commas", replaced(sound_rows(), ",", ";")),
        rows_case("a missing column", replaced(sound_rows(), "dec", "decl")),
        rows_case("a column that could be two", replaced(sound_rows(), "ra,dec,s", "RA,Ra,s")),
        rows_case("a record that is too short", sound_rows() + "10,20\n"),
        rows_case("a record that is too long", sound_rows() + "10,20,1,5\n"),
        rows_case("an empty line between rows", "ra,dec,s\n\n" + sound_rows().substr(9)),
        rows_case("a text for a number", sound_rows() + "10,N/A,1\n"),
        rows_case("a comma in a number", sound_rows() + "10,\"20,5\",1\n"),
        rows_case("a number out of range", sound_rows() + "10,20,1e999\n"),
        rows_case("a quote that never ends", sound_rows() + "10,20,\"1\n"),
        rows_case("a line of a million characters",
                  sound_rows() + std::string(1000000, 'x') + ",20,1\n"),
        rows_case("text in UTF-16", std::string("r\0a\0,\0d\0e\0c\0", 12)),
        rows_case("missing positions", sound_rows() + "nan,20,1\n10,,1\n,,1\n"),
        rows_case("longitudes above 360", sound_rows() + "400,20,1\n"),
        rows_case("latitudes below -90", sound_rows() + "10,-90.5,1\n10,-91,1\n"),
        rows_case("infinite positions", sound_rows() + "inf,20,1\n10,-inf,1\n"),
        job_case("a source in two bins", "[2.0, inf]", "[1.0, inf]"),
        job_case("a table of a CSV file",
                 "frame = \"icrs\"\ncolumns",
                 "frame = \"icrs\"\ntable = \"A\"\ncolumns"),
        file_case("a folder as catalogue", ".", [](const TemporaryFolder&) {}),
        file_case("binary junk", "a.dat", write_junk),
        file_case("a gzip file cut short", "a.csv.gz", write_cut_gzip),
        file_case("a gzip file in a gzip file", "a.csv.gz", write_double_gzip),
        file_case("a FITS file cut short", "a.fits", write_cut_fits),
        file_case("a FITS file without table", "a.fits", write_fits_without_table),
        file_case("a FITS header that breaks off", "a.fits", write_broken_header),
        file_case("a missing HDU", "a.fits", write_fits, "\"LANTERN\""),
        file_case("an HDU number too high", "a.fits", write_fits, "7"),
        file_case("an HDU that is no table", "a.fits", write_fits, "0"),
        file_case("a missing FITS column", "a.fits", write_fits_without_column),
        file_case("a FITS column of texts", "a.fits", write_fits_with_text),
        file_case("a FITS column of vectors", "a.fits", write_fits_with_vectors),
        file_case("an HDF5 file without group", "a.h5", write_h5, "\"sources\""),
        file_case("an HDF5 file without column", "a.h5", write_h5_without_column),
        file_case("HDF5 columns of unlike length", "a.h5", write_h5_of_unlike_length),
        file_case("an HDF5 column of pairs", "a.h5", write_h5_with_pairs),
        file_case("an HDF5 file cut short", "a.h5", write_cut_h5),
    };
    CHECK(other_answers(cases) == "");
}

TEST_CASE("bad maps are answered exactly", "[app]") {
    using namespace test::bad_input;
    const std::vector<double> ones(192, 1.0);
    const auto with = [](std::vector<double> values, std::size_t at, double value) {
        values[at] = value;
        return values;
    };
    const auto map = [](const std::string& file,
                        const std::vector<double>& values,
                        MapCards cards = {}) {
        return [=](const TemporaryFolder& folder) { write_map(folder / file, values, cards); };
    };
    MapCards nowhere, elsewhere, odd, nest, notmap;
    nowhere.coordsys = "";
    elsewhere.coordsys = "E";
    odd.nside = 3;
    nest.ordering = "NESTD";
    notmap.pixtype = "";
    notmap.nside = 0;
    const std::string e = "exposure.fits", c = "counts.fits";
    const std::vector<Case> cases{
        exposure_case("a map of the wrong size", map(e, std::vector<double>(191, 1.0))),
        exposure_case("a map of no power of two", map(e, ones, odd)),
        exposure_case("a map of unknown ordering", map(e, ones, nest)),
        exposure_case("a FITS table that is no map", map(e, ones, notmap)),
        exposure_case("a map in no frame", map(e, ones, nowhere)),
        exposure_case("a map in two frames", map(e, ones, elsewhere), "\nmap_frame = \"icrs\""),
        exposure_case("negative exposure", map(e, with(ones, 5, -0.25))),
        exposure_case("exposure above one", map(e, with(ones, 7, 1.5))),
        exposure_case("infinite exposure", map(e, with(ones, 7, INFINITY))),
        exposure_case("no exposure anywhere", map(e, std::vector<double>(192, 0.0))),
        exposure_case("a CSV file as exposure",
                      [](const TemporaryFolder& f) { f.write("exposure.fits", sound_rows()); }),
        exposure_case("a map cut short", write_cut_map),
        exposure_case("a MOC with a wrong number", write_wrong_moc),
        exposure_case("a MOC of time", write_time_moc),
        counts_case("a fraction of a source", map(c, with(ones, 3, 1.5))),
        counts_case("less than no source", map(c, with(ones, 3, -1.0))),
        counts_case("no count where there is exposure", map(c, with(ones, 3, NAN))),
        counts_case("a count map that is too coarse", map(c, std::vector<double>(48, 1.0))),
        counts_case("a count map in another frame", map(c, ones, elsewhere)),
        counts_case("more sources in a pixel than can be counted", map(c, with(ones, 3, 5e9))),
        counts_case("a MOC as count map", write_moc_as_counts),
    };
    CHECK(other_answers(cases) == "");
}

TEST_CASE("bad chain and counts files are answered exactly", "[app]") {
    using namespace test::bad_input;
    const std::vector<std::string> summarise = {"summarise", "FOLDER/chains.h5"};
    const std::vector<std::string> sample = {"sample", "FOLDER/job.toml", "-o", "FOLDER/out"};
    const std::vector<Case> cases{
        {"no such chain", [](const TemporaryFolder&) {}, summarise},
        {"a text as chain",
         [](const TemporaryFolder& f) { f.write("chains.h5", "no chain\n"); },
         summarise},
        {"an HDF5 file of others as chain", write_foreign_chain, summarise},
        {"a counts file as chain", write_counts_as_chain, summarise},
        {"a chain of a newer schema", write_newer_chain, summarise},
        {"a chain cut short", write_cut_chain, summarise},
        {"a chain with a flipped bit", write_bent_chain, summarise},
        {"counts of another job", write_counts_of_another_job, sample},
        {"counts with a flipped bit", write_bent_counts, sample},
        {"counts cut short", write_cut_counts, sample},
    };
    CHECK(other_answers(cases) == "");
}

TEST_CASE("trouble with files and surroundings is answered exactly", "[app]") {
    const auto sound = [](const TemporaryFolder& folder) { write_sound_inputs(folder); };
    const auto occupied = [](const TemporaryFolder& folder) {
        write_sound_inputs(folder);
        folder.write("out", "a file\n");
    };
    const auto there = [](const TemporaryFolder& folder) {
        write_sound_inputs(folder);
        std::filesystem::create_directory(folder / "out");
        folder.write("out/counts.h5", "mine\n");
    };
    const std::string count = "PROGRAM count FOLDER/job.toml -o FOLDER/out";
    const auto shell = [&](const std::string& command) {
        return std::vector<std::string>{"/bin/sh", "-c", replaced(command, "COUNT", count)};
    };
    const std::vector<Case> cases{
        {"a file where the folder belongs", occupied},
        {"results that exist", there},
        {"a folder that cannot be made",
         sound,
         {"count", "FOLDER/job.toml", "-o", "/proc/deviascope"}},
        {"a full standard output", sound, shell("exec COUNT > /dev/full")},
        {"a closed standard output", sound, shell("exec COUNT >&-")},
        {"a reader that leaves", sound, shell("(COUNT; echo exit $? >&2) | true")},
        {"a wrong OMP_NUM_THREADS", sound, shell("OMP_NUM_THREADS=many exec COUNT")},
        {"no terminal", sound, shell("TERM= exec COUNT")},
        {"an odd locale", sound, shell("LC_ALL=de_DE.UTF-8 LANG=xx exec COUNT")},
    };
    CHECK(other_answers(cases) == "");
    if (geteuid() == 0) return;  // who may read everything
    const std::vector<Case> forbidden{
        {"a catalogue without permission", [](const TemporaryFolder& folder) {
             write_sound_inputs(folder);
             std::filesystem::permissions(folder / "dunlin.csv", std::filesystem::perms::none);
         }}};
    CHECK(other_answers(forbidden) == "");
}

TEST_CASE("a full disk is exit code 5, and nothing half-written is left", "[app]") {
    const TemporaryFolder folder;
    write_sound_inputs(folder);
    const std::string command =
        std::string("ulimit -f 1; trap '' XFSZ; exec ") + DEVIASCOPE_PROGRAM + " count " +
        (folder / "job.toml").string() + " -o " + (folder / "out").string();
    const auto result = test::run_process({"/bin/sh", "-c", command});
    CHECK(result.exit_code == 5);
    CHECK_THAT(result.err,
               Catch::Contains("out/counts.h5") && Catch::Contains("File too large"));
    CHECK(std::filesystem::is_empty(folder / "out"));
}
