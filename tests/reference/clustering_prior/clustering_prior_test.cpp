// SPDX-License-Identifier: GPL-2.0-or-later
#include <catch2/catch.hpp>

#include "python_check.h"

using namespace deviascope;

TEST_CASE("the table of clustering dipoles in clustering-modest follows from its sources",
          "[job]") {
    const auto result = test::run_python(
        DEVIASCOPE_TEST_DATA "/reference/clustering_prior/dipole_of_clustering.py",
        {DEVIASCOPE_SOURCE_FOLDER "/priors/clustering-modest.toml"});
    INFO(result.output);
    CHECK(result.exit_code == 0);
}
