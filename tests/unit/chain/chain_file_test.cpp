// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/chain/chain_file.h"

#include <catch2/catch.hpp>
#include <fstream>
#include <set>

#include "core/h5/reader.h"
#include "core/h5/replaced_file.h"
#include "deviascope/core/error.h"
#include "deviascope/counts/counts_file.h"
#include "example_chain.h"
#include "full_disk.h"
#include "same_chain.h"
#include "temporary_folder.h"

using namespace deviascope;
using test::bytes_of;
using test::example_draws;
using test::example_outcome;
using test::example_state;
using test::example_warm_up;
using test::FullDisk;
using test::same;
using test::TemporaryFolder;

namespace {

namespace fs = std::filesystem;

Draws joined(Draws first, const Draws& second) {
    const auto add = [](auto& to, const auto& from) {
        to.insert(to.end(), from.begin(), from.end());
    };
    first.n_rows += second.n_rows;
    add(first.value, second.value);
    add(first.log_posterior, second.log_posterior);
    add(first.log_likelihood, second.log_likelihood);
    return first;
}

fs::path spoilt(const TemporaryFolder& folder, const h5::Edit& edit) {
    fs::remove(folder / "chains.h5");
    test::write_example_chain(folder / "chains.h5");
    h5::change_file(folder / "chains.h5", edit);
    return folder / "chains.h5";
}

std::set<std::string> files_in(const TemporaryFolder& folder) {
    std::set<std::string> names;
    for (const auto& entry : fs::directory_iterator(folder.path()))
        names.insert(entry.path().filename().string());
    return names;
}

/// Bytes this process has written so far (proc(5), /proc/pid/io).
std::int64_t bytes_written() {
    std::ifstream io("/proc/self/io");
    std::string name;
    for (std::int64_t number = 0; io >> name >> number;)
        if (name == "wchar:") return number;
    return -1;
}

std::span<const std::int64_t> one(const std::int64_t& number) {
    return {&number, 1};
}

}  // namespace

TEST_CASE("a finished chain comes back bit for bit", "[chain]") {
    const TemporaryFolder folder;
    test::write_example_chain(folder / "chains.h5");
    const Chain chain = read_chain(folder / "chains.h5");
    Provenance provenance = test::example_provenance();
    provenance.ended = "2026-08-17T11:30:00Z";
    CHECK(same(chain.provenance, provenance));
    CHECK(same(chain.options, test::example_options()));
    CHECK(same(chain.parameters, test::example_parameters()));
    CHECK(same(chain.vectors, test::example_vectors()));
    CHECK(same(chain.counts, test::example_counts()));
    CHECK(same(chain.warm_up, example_warm_up()));
    CHECK(same(chain.draws, example_draws(0, 5)));
    CHECK(same(chain.state, example_state(5)));
    CHECK(same(chain.outcome, example_outcome(5)));
}

TEST_CASE("a chain is readable at every stage and says that it is unfinished", "[chain]") {
    const TemporaryFolder folder;
    const fs::path path = folder / "chains.h5";
    ChainWriter writer = test::begin_example(path);
    Chain chain = read_chain(path);
    CHECK(chain.outcome.end == Outcome::End::not_run);
    CHECK(chain.draws.n_rows == 0);
    CHECK(chain.draws.n_parameters == 7);
    CHECK(chain.state.coordinates.empty());
    CHECK(chain.provenance.ended.empty());

    writer.warm_up(example_warm_up());
    chain = read_chain(path);
    CHECK(same(chain.warm_up, example_warm_up()));
    CHECK(chain.outcome.discarded == 192);

    writer.block(example_draws(0, 4), example_state(4));
    chain = read_chain(path);
    CHECK(same(chain.draws, example_draws(0, 4)));
    CHECK(same(chain.state, example_state(4)));
    CHECK(chain.outcome.end == Outcome::End::not_run);
    CHECK(chain.outcome.n_rows == 4);
    CHECK(chain.outcome.steps == example_state(4).step);
    CHECK(same(chain.outcome.tally, example_state(4).tally));
    CHECK(chain.outcome.warm_up_settled);
}

TEST_CASE("draws do not depend on where blocks end, across chunks", "[chain]") {
    const TemporaryFolder folder;
    ChainWriter writer = test::begin_example(folder / "chains.h5");
    writer.warm_up(example_warm_up());
    Eigen::Index n_rows = 0;
    for (const Eigen::Index n_more : {99, 1, 1, 150, 49}) {
        writer.block(example_draws(n_rows, n_more), example_state(n_rows + n_more));
        n_rows += n_more;
    }
    CHECK(same(read_chain(folder / "chains.h5").draws, example_draws(0, 300)));
}

TEST_CASE("a chain that is continued equals one that never stopped, byte for byte", "[chain]") {
    const TemporaryFolder folder;
    {
        ChainWriter writer = test::begin_example(folder / "stopped.h5");
        writer.warm_up(example_warm_up());
        writer.block(example_draws(0, 3), example_state(3));
    }
    ChainWriter again(folder / "stopped.h5", read_chain(folder / "stopped.h5"));
    again.block(example_draws(3, 0), example_state(3));
    again.block(example_draws(3, 2), example_state(5));
    again.finish(example_outcome(5), "2026-08-17T11:30:00Z");
    test::write_example_chain(folder / "whole.h5");
    CHECK(bytes_of(folder / "stopped.h5") == bytes_of(folder / "whole.h5"));
}

TEST_CASE("a chain that is continued after its end is unfinished again", "[chain]") {
    const TemporaryFolder folder;
    test::write_example_chain(folder / "chains.h5");
    ChainWriter writer(folder / "chains.h5", read_chain(folder / "chains.h5"));
    writer.block(example_draws(5, 1), example_state(6));
    const Chain chain = read_chain(folder / "chains.h5");
    CHECK(chain.outcome.end == Outcome::End::not_run);
    CHECK(same(chain.draws, joined(example_draws(0, 5), example_draws(5, 1))));
}

TEST_CASE("a chain without a block cannot be continued", "[chain]") {
    const TemporaryFolder folder;
    test::begin_example(folder / "chains.h5").warm_up(example_warm_up());
    const Chain stored = read_chain(folder / "chains.h5");
    CHECK_THROWS_WITH(ChainWriter(folder / "chains.h5", stored), Catch::Contains("no block"));
}

TEST_CASE("an empty list of libraries is filled in", "[chain]") {
    const TemporaryFolder folder;
    Provenance provenance = test::example_provenance();
    provenance.libraries.clear();
    const ChainWriter writer(folder / "chains.h5", provenance, {}, {}, {}, {});
    const std::string found = read_chain(folder / "chains.h5").provenance.libraries;
    CHECK(found == library_versions());
    CHECK_THAT(found, Catch::Contains("HDF5 1.") && Catch::Contains("Eigen 3."));
}

TEST_CASE("an existing chain is never written over", "[chain]") {
    const TemporaryFolder folder;
    test::write_example_chain(folder / "chains.h5");
    const std::string before = bytes_of(folder / "chains.h5");
    CHECK_THROWS_WITH(test::begin_example(folder / "chains.h5"),
                      Catch::Contains("exists already") && Catch::Contains("--resume"));
    CHECK(bytes_of(folder / "chains.h5") == before);
    CHECK_THROWS_AS(test::begin_example(folder.path()), OutputError);
}

TEST_CASE("a chain cannot begin where nothing can be written", "[chain]") {
    const TemporaryFolder folder;
    folder.write("regular", "");
    CHECK_THROWS_WITH(test::begin_example(folder / "regular" / "chains.h5"),
                      Catch::Contains("Not a directory"));
    CHECK_THROWS_WITH(test::begin_example(folder / "none" / "chains.h5"),
                      Catch::Contains("No such file or directory"));
}

TEST_CASE("a disk that fills up costs nothing that was stored", "[chain]") {
    const TemporaryFolder folder;
    const fs::path path = folder / "chains.h5";
    ChainWriter writer = test::begin_example(path);
    writer.warm_up(example_warm_up());
    writer.block(example_draws(0, 3), example_state(3));
    const std::string before = bytes_of(path);
    {
        const FullDisk full(before.size() - 1);
        CHECK_THROWS_WITH(writer.block(example_draws(3, 2), example_state(5)),
                          Catch::Contains("the block up to step 207") &&
                              Catch::Contains("File too large") &&
                              Catch::Contains("24 draws (3 rows, up to step 201) are safe"));
        CHECK_THROWS_AS(writer.finish(example_outcome(3), "now"), OutputError);
    }
    CHECK(bytes_of(path) == before);
    CHECK(files_in(folder) == std::set<std::string>{"chains.h5", "chains.h5.lock"});
    writer.block(example_draws(3, 2), example_state(5));
    CHECK(same(read_chain(path).draws, example_draws(0, 5)));
}

TEST_CASE("a chain has one writer at a time", "[chain]") {
    const TemporaryFolder folder;
    const fs::path path = folder / "chains.h5";
    {
        const ChainWriter writer = test::begin_example(path);
        const ChainLock another(folder / "other.h5");
        CHECK_THROWS_WITH(ChainLock(path),
                          Catch::Contains("chains.h5.lock") &&
                              Catch::Contains("another process is writing this chain"));
    }
    CHECK(files_in(folder) == std::set<std::string>{"chains.h5"});
    fs::remove(path);
    const ChainLock lock(path);
    const ChainWriter shares_it(lock, {}, {}, {}, {}, {});
}

TEST_CASE("what an earlier writer left beside a chain is removed", "[chain]") {
    const TemporaryFolder folder;
    folder.write("chains.h5.next", "half a block");
    folder.write("chains.h5.old", "half an exchange");
    folder.write("chains.h5.tmp", "half a beginning");
    folder.write("chains.h5.lock", "");
    test::write_example_chain(folder / "chains.h5");
    CHECK(files_in(folder) == std::set<std::string>{"chains.h5"});
    CHECK(same(read_chain(folder / "chains.h5").draws, example_draws(0, 5)));
}

TEST_CASE("storing a block takes what the block holds, not what the file holds", "[chain]") {
    const TemporaryFolder folder;
    ChainWriter writer = test::begin_example(folder / "chains.h5");
    writer.warm_up(example_warm_up());
    std::vector<std::int64_t> cost;
    for (Eigen::Index block = 0; block < 120; ++block) {
        CHECK(writer.rows_together(block == 0 ? 25 : 0) == 25);
        const std::int64_t before = bytes_written();
        writer.block(example_draws(25 * block, 25), example_state(25 * (block + 1)));
        cost.push_back(bytes_written() - before);
    }
    REQUIRE(cost[10] > 0);
    CHECK(static_cast<double>(cost.back()) < 1.5 * static_cast<double>(cost[10]));
    CHECK(static_cast<double>(cost.back()) <
          0.2 * static_cast<double>(fs::file_size(folder / "chains.h5")));
    const Chain stored = read_chain(folder / "chains.h5");
    CHECK(same(stored.draws, example_draws(0, 120 * 25)));
}

TEST_CASE("a reader that keeps the chain open keeps what it opened", "[chain]") {
    const TemporaryFolder folder;
    const fs::path path = folder / "chains.h5";
    ChainWriter writer = test::begin_example(path);
    writer.warm_up(example_warm_up());
    writer.block(example_draws(0, 3), example_state(3));
    const h5::Reader reader(path);
    Eigen::Index n_rows = 3;
    for (; n_rows < 9; ++n_rows)
        writer.block(example_draws(n_rows, 1), example_state(n_rows + 1));
    CHECK(test::same_bits(reader.reals("/draws", {3, 2, 4, 7}), example_draws(0, 3).value));
    CHECK(same(read_chain(path).draws, example_draws(0, 9)));
}

TEST_CASE("the Gaussian of the independence kernel is kept with the warm-up", "[chain]") {
    const TemporaryFolder folder;
    ChainWriter writer = test::begin_example(folder / "chains.h5");
    WarmUp warm_up = example_warm_up();
    warm_up.approximation =
        CoordinateGaussian{Eigen::Vector2d(1.0 / 3.0, -0.0),
                           (Eigen::Matrix2d() << 2.0, 0.0, 0.1, 5e-324).finished()};
    writer.warm_up(warm_up);
    const auto found = read_chain(folder / "chains.h5").warm_up.approximation;
    REQUIRE(found.has_value());
    CHECK(found->mean == warm_up.approximation->mean);
    CHECK(found->factor == warm_up.approximation->factor);
}

TEST_CASE("a chain that vanished while it is written is an output error", "[chain]") {
    const TemporaryFolder folder;
    ChainWriter writer = test::begin_example(folder / "chains.h5");
    fs::remove(folder / "chains.h5");
    CHECK_THROWS_WITH(writer.warm_up(example_warm_up()),
                      Catch::Contains("the warm-up of 192 steps"));
}

TEST_CASE("sizes that do not fit are our own fault and leave the file alone", "[chain]") {
    const TemporaryFolder folder;
    ChainWriter writer = test::begin_example(folder / "chains.h5");
    const std::string before = bytes_of(folder / "chains.h5");
    Draws short_of_one = example_draws(0, 3);
    short_of_one.value.pop_back();
    CHECK_THROWS_AS(writer.block(short_of_one, example_state(3)), InternalError);
    EnsembleState odd_state = example_state(3);
    odd_state.coordinates.pop_back();
    CHECK_THROWS_AS(writer.block(example_draws(0, 3), odd_state), InternalError);
    WarmUp warm_up = example_warm_up();
    warm_up.step.pop_back();
    CHECK_THROWS_AS(writer.warm_up(warm_up), InternalError);
    CHECK(bytes_of(folder / "chains.h5") == before);
}

TEST_CASE("files that are no chains are input errors", "[chain]") {
    const TemporaryFolder folder;
    write_counts(folder / "counts.h5", {test::example_counts(), "", ""});
    CHECK_THROWS_WITH(read_chain(folder / "counts.h5"),
                      Catch::Contains("\"deviascope counts\"") &&
                          Catch::Contains("a deviascope chain is needed"));
    h5::write_file(folder / "foreign.h5", [](h5::Writer& w) { w.group("/draws", "other"); });
    CHECK_THROWS_WITH(read_chain(folder / "foreign.h5"),
                      Catch::Contains("without a format attribute"));
    CHECK_THROWS_AS(read_chain(folder.write("text.h5", "[job]\n")), InputError);
    CHECK_THROWS_AS(read_chain(folder.write("empty.h5", "")), InputError);
    CHECK_THROWS_AS(read_chain(folder.path()), InputError);
}

TEST_CASE("parts of a chain that disagree are input errors", "[chain]") {
    const TemporaryFolder folder;
    const std::vector<double> row(2 * 4 * 7, 0.5);
    const std::vector<std::pair<h5::Edit, std::string>> cases{
        {[](h5::Writer& w) { w.attribute("/", "schema", std::int64_t{2}); }, "newer version"},
        {[&](h5::Writer& w) { w.append("/draws", std::span<const double>(row)); },
         "/log_posterior: extents 5 x 2 x 4; 6 x 2 x 4"},
        {[](h5::Writer& w) { w.append("/state/step", one(7)); }, "/state/rows: extents 3; 4"},
        {[](h5::Writer& w) { w.attribute("/outcome", "rows", std::int64_t{4}); },
         "5 are stored"},
        {[](h5::Writer& w) { w.attribute("/outcome", "end", std::string("well")); },
         "unfinished, converged, max_steps, interrupted are allowed"},
        {[](h5::Writer& w) { w.attribute("/outcome", "steps", std::int64_t{-1}); },
         "0 or more is needed"},
        {[](h5::Writer& w) { w.attribute("/job", "seed", std::string("x")); },
         "an integer is needed"},
        {[](h5::Writer& w) { w.attribute("/counts", "nside", std::int64_t{0}); },
         "a power of two is needed"}};
    for (const auto& [edit, words] : cases) {
        INFO(words);
        CHECK_THROWS_WITH(read_chain(spoilt(folder, edit)), Catch::Contains(words));
        CHECK_THROWS_AS(read_chain(folder / "chains.h5"), InputError);
    }
}

TEST_CASE("vectors outside the columns and draws without names are input errors", "[chain]") {
    const TemporaryFolder folder;
    const auto begin = [&](const std::vector<Parameter>& parameters,
                           const std::vector<VectorParameter>& vectors) {
        fs::remove(folder / "chains.h5");
        return ChainWriter(folder / "chains.h5", {}, parameters, vectors, {}, {});
    };
    begin(test::example_parameters(), {{"velocity", 5, true, true}});
    CHECK_THROWS_WITH(read_chain(folder / "chains.h5"),
                      Catch::Contains("column 5 of 7 parameters"));
    ChainWriter writer = begin({test::example_parameters().front()}, {});
    writer.block(example_draws(0, 1), example_state(1));
    CHECK_THROWS_WITH(read_chain(folder / "chains.h5"),
                      Catch::Contains("/draws: 7 columns; 1 parameters are named"));
}
