// SPDX-License-Identifier: GPL-2.0-or-later
#include <catch2/catch.hpp>

#include "example_chain.h"
#include "python_check.h"
#include "temporary_folder.h"

using namespace deviascope;

TEST_CASE("h5py and h5dump read counts and chains without knowing us", "[chain]") {
    const test::TemporaryFolder folder;
    test::write_example_chain(folder / "chains.h5");
    write_counts(folder / "counts.h5", {test::example_counts(), "0123abcd", "0.1.0"});
    const auto result = test::run_python(DEVIASCOPE_TEST_DATA "/reference/chain/read_files.py",
                                         {folder.path().string()});
    INFO(result.output);
    CHECK(result.exit_code == 0);
    CHECK(result.output == "all as expected\n");
}
