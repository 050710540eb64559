// SPDX-License-Identifier: GPL-2.0-or-later
#include <fmt/format.h>
#include <catch2/catch.hpp>
#include <fstream>

#include "deviascope/chain/export_draws.h"
#include "deviascope/figures/report.h"
#include "deviascope/summary/result_tables.h"
#include "deviascope/summary/sky_files.h"
#include "hard_posteriors.h"
#include "python_check.h"
#include "temporary_folder.h"

using namespace deviascope;
using deviascope::test::ball;
using deviascope::test::PosedPosterior;
using deviascope::test::TemporaryFolder;

namespace {

void write_all(const PosedPosterior& posed, const TemporaryFolder& folder) {
    write_sky_files({posed.chain(), posed.space(), posed.summary(), posed.directions()},
                    folder.path());
    export_draws(posed.chain(), folder / "draws.fits", 1);
    const auto figures = make_figures(posed.source(), {});
    for (const Figure& figure : figures) {
        folder.write(figure.name + ".svg", figure.svg);
        folder.write(figure.name + ".pdf", figure.pdf);
        folder.write(figure.name + ".png", figure.png);
    }
    folder.write("report.html", report_html(posed.source(), figures));
    folder.write("summary.json", to_json(posed.summary()));
}

void check_results(const test::Pose& pose) {
    const TemporaryFolder folder;
    const PosedPosterior posed(pose);
    write_all(posed, folder);
    const auto result = test::run_python(
        DEVIASCOPE_TEST_DATA "/reference/results/check_results.py", {folder.path().string()});
    INFO(result.output);
    CHECK(result.exit_code == 0);
    CHECK_THAT(result.output, Catch::EndsWith("all as expected\n"));
}

}  // namespace

TEST_CASE("results are read by general programs as the standards say", "[figures]") {
    check_results({ball(0.02 * direction_of(178.0, 35.0), 0.003),
                   {ball(0.02 * direction_of(60.0, -80.0), 0.004)},
                   {"dunlin"}});
}

TEST_CASE("results of a direction known to half a minute of arc, in another frame",
          "[figures]") {
    test::Pose pose{test::tiny(), {test::one_sided()}, {"dunlin"}};
    pose.frame = Frame::ecliptic;
    check_results(pose);
}
