// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/counts/counts_file.h"

#include <catch2/catch.hpp>
#include <functional>

#include "core/h5/identity.h"
#include "core/h5/replaced_file.h"
#include "deviascope/core/error.h"
#include "example_chain.h"
#include "full_disk.h"
#include "same_chain.h"
#include "temporary_folder.h"

using namespace deviascope;
using test::example_counts;
using test::same;
using test::TemporaryFolder;

namespace {

namespace fs = std::filesystem;

const std::string faint = "/counts/dunlin/bins/faint";

/// A sound file, changed by one edit.
fs::path spoilt(const TemporaryFolder& folder, const h5::Edit& edit) {
    write_counts(folder / "counts.h5", {example_counts(), "digest", "0.1.0"});
    h5::change_file(folder / "counts.h5", edit);
    return folder / "counts.h5";
}

/// Counts that are well-formed for the writer, but say what cannot be.
fs::path impossible(const TemporaryFolder& folder, const std::function<void(Counts&)>& edit) {
    Counts counts = example_counts();
    edit(counts);
    write_counts(folder / "counts.h5", {counts, "digest", "0.1.0"});
    return folder / "counts.h5";
}

}  // namespace

TEST_CASE("counts come back from counts.h5 bit for bit, surveys and bins in order",
          "[counts]") {
    const TemporaryFolder folder;
    write_counts(folder / "counts.h5", {example_counts(), "0123abcd", "0.1.0"});
    const CountsFile file = read_counts(folder / "counts.h5");
    CHECK(same(file.counts, example_counts()));
    CHECK(file.digest == "0123abcd");
    CHECK(file.version == "0.1.0");
}

TEST_CASE("a full sky at nside 256 takes less than a fifth of its plain size", "[counts]") {
    // 20 bytes a pixel in memory; counts of a handful of sources a pixel.
    Counts counts;
    counts.nside = 256;
    SurveyCounts survey;
    survey.name = "binnacle";
    survey.footprints.resize(1);
    BinCounts bin{"all", 0, {}};
    const std::int64_t n_pixels = Pixelisation(256).n_pixels();
    for (std::int64_t pixel = 0; pixel < n_pixels; ++pixel) {
        survey.footprints[0].pixel.push_back(pixel);
        survey.footprints[0].exposure.push_back(1.0);
        bin.count.push_back(static_cast<std::uint32_t>(pixel * 2654435761 % 4294967296 >> 28));
    }
    survey.bins = {bin};
    counts.surveys = {survey};
    const TemporaryFolder folder;
    write_counts(folder / "counts.h5", {counts, "", ""});
    CHECK(fs::file_size(folder / "counts.h5") < static_cast<std::uintmax_t>(n_pixels) * 4);
    CHECK(same(read_counts(folder / "counts.h5").counts, counts));
}

TEST_CASE("counts without surveys, pixels, cuts or bins are counts", "[counts]") {
    Counts counts;
    const TemporaryFolder folder;
    write_counts(folder / "none.h5", {counts, "", ""});
    CHECK(same(read_counts(folder / "none.h5").counts, counts));
    counts.surveys.resize(1);
    counts.surveys[0].name = "dunlin";
    counts.surveys[0].footprints.resize(1);
    counts.surveys[0].bins = {{"faint", 0, {}}};
    write_counts(folder / "empty.h5", {counts, "", ""});
    CHECK(same(read_counts(folder / "empty.h5").counts, counts));
}

TEST_CASE("writing counts replaces an older file, whole", "[counts]") {
    const TemporaryFolder folder;
    write_counts(folder / "counts.h5", {example_counts(), "old", ""});
    write_counts(folder / "counts.h5", {Counts{}, "new", ""});
    CHECK(read_counts(folder / "counts.h5").digest == "new");
    CHECK(read_counts(folder / "counts.h5").counts.surveys.empty());
}

TEST_CASE("a full disk while writing counts leaves the older file", "[counts]") {
    const TemporaryFolder folder;
    write_counts(folder / "counts.h5", {example_counts(), "old", ""});
    {
        const test::FullDisk full(4096);
        CHECK_THROWS_WITH(write_counts(folder / "counts.h5", {example_counts(), "new", ""}),
                          Catch::Contains("counts.h5.tmp: cannot be written: File too large"));
    }
    CHECK(read_counts(folder / "counts.h5").digest == "old");
}

TEST_CASE("counts cannot be written below a file, or over a folder", "[counts]") {
    const TemporaryFolder folder;
    folder.write("regular", "");
    const CountsFile file{example_counts(), "", ""};
    CHECK_THROWS_AS(write_counts(folder / "regular" / "counts.h5", file), OutputError);
    fs::create_directory(folder / "counts.h5");
    CHECK_THROWS_AS(write_counts(folder / "counts.h5", file), OutputError);
    CHECK(fs::is_directory(folder / "counts.h5"));
}

TEST_CASE("counts that do not fit their footprint are our own fault", "[counts]") {
    const TemporaryFolder folder;
    CHECK_THROWS_AS(
        impossible(folder, [](Counts& c) { c.surveys[0].bins[0].count.pop_back(); }),
        InternalError);
    CHECK_THROWS_AS(impossible(folder, [](Counts& c) { c.surveys[0].bins[0].footprint = 2; }),
                    InternalError);
    CHECK_THROWS_AS(impossible(folder, [](Counts& c) { c.surveys[0].name = "a/b"; }),
                    InternalError);
    CHECK(fs::is_empty(folder.path()));
}

TEST_CASE("pixels, exposures and grids that cannot be are input errors", "[counts]") {
    const TemporaryFolder folder;
    using Edit = std::function<void(Counts&)>;
    const std::vector<std::pair<Edit, std::string>> cases{
        {[](Counts& c) {
             c.surveys[0].footprints[1].pixel = {191, 190};
         },
         "pixel 190 after 191"},
        {[](Counts& c) {
             c.surveys[0].footprints[1].pixel = {191, 191};
         },
         "pixel 191 after 191"},
        {[](Counts& c) {
             c.surveys[0].footprints[1].pixel = {190, 192};
         },
         "below 192"},
        {[](Counts& c) {
             c.surveys[0].footprints[1].pixel = {-1, 1};
         },
         "pixel -1 after -1"},
        {[](Counts& c) { c.surveys[0].footprints[1].exposure[0] = 0.0; }, "exposure: 0"},
        {[](Counts& c) { c.surveys[0].footprints[1].exposure[0] = 1.5; }, "exposure: 1.5"},
        {[](Counts& c) { c.surveys[0].footprints[1].exposure[0] = std::nan(""); }, "nan"},
        {[](Counts& c) { c.nside = 3; }, "nside: 3; a power of two"}};
    for (const auto& [edit, words] : cases) {
        INFO(words);
        CHECK_THROWS_WITH(read_counts(impossible(folder, edit)), Catch::Contains(words));
        CHECK_THROWS_AS(read_counts(folder / "counts.h5"), InputError);
    }
}

TEST_CASE("attributes of counts.h5 that cannot be are input errors", "[counts]") {
    const TemporaryFolder folder;
    using Edit = h5::Edit;
    const std::vector<std::pair<Edit, std::string>> cases{
        {[](h5::Writer& w) { w.attribute("/counts", "ordering", std::string("NESTED")); },
         "RING is needed"},
        {[](h5::Writer& w) { w.attribute("/counts", "frame", std::string("dome")); },
         "galactic, icrs, ecliptic are allowed"},
        {[](h5::Writer& w) { w.attribute("/counts", "nside", 4.0); }, "an integer is needed"},
        {[](h5::Writer& w) { w.attribute(faint, "footprint", std::int64_t{2}); }, "1 … 1"},
        {[](h5::Writer& w) { w.attribute(faint, "footprint", std::int64_t{0}); }, "1 … 1"},
        {[](h5::Writer& w) { w.attribute(faint, "order", std::int64_t{2}); }, "once"},
        {[](h5::Writer& w) { w.attribute("/", "schema", std::int64_t{2}); }, "newer version"},
        {[](h5::Writer& w) { w.attribute("/", "format", std::string("x")); },
         "a deviascope counts is needed"},
        {[](h5::Writer& w) { w.group("/counts/stray", "no survey"); }, "order: missing"}};
    for (const auto& [edit, words] : cases) {
        INFO(words);
        CHECK_THROWS_WITH(read_counts(spoilt(folder, edit)), Catch::Contains(words));
        CHECK_THROWS_AS(read_counts(folder / "counts.h5"), InputError);
    }
}
