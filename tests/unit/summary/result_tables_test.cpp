// SPDX-License-Identifier: GPL-2.0-or-later
#include <catch2/catch.hpp>

#include "deviascope/summary/result_tables.h"
#include "example_chain.h"
#include "example_summary.h"

using namespace deviascope;

TEST_CASE("tables round by the uncertainty, in every form", "[summary]") {
    const ResultTable table = results_table(example::summary());
    const std::string latex = to_latex(table);
    // 1.374e-3 with half a 68 % interval of 1.92e-4: two digits of it.
    CHECK_THAT(
        latex,
        Catch::Contains("$1.37 \\pm 0.19$") || Catch::Contains("$1.37^{+0.19}_{-0.19}$"));
    CHECK_THAT(latex, Catch::Contains("$412^{+58}_{-57}$"));  // times 299,792.458 km/s
    CHECK_THAT(latex, Catch::Contains("\\toprule") && Catch::Contains("10^{-3}"));
    const std::string markdown = to_markdown(table);
    CHECK_THAT(markdown, Catch::Contains("| velocity | km/s | 412 +58 −57 |"));
    CHECK_THAT(markdown, Catch::Contains("–"));  // lantern has no direction
    CHECK_THAT(table.csv, Catch::Contains("velocity,0.001374,"));
    CHECK_THAT(to_html(table), Catch::Contains("<th scope=\"row\">velocity</th>"));
    for (const auto& row : table.rows) CHECK(row.size() == table.header.size());
}

TEST_CASE("a table gives the upper limit of what is not told from zero", "[summary]") {
    Summary summary = example::summary();
    CHECK_THAT(results_table(summary).caption, !Catch::Contains("upper limit"));
    summary.velocity.amplitude_limits = UpperLimits{4e-4, 1.2345e-3};
    summary.intrinsic[1].amplitude_limits = UpperLimits{1.6e-3, 3.456e-3};
    const ResultTable table = results_table(summary);
    CHECK_THAT(table.caption, Catch::Contains("upper limit below which 95.45 %"));
    // Two digits of half the 68 % limit: 60 km/s and 0.8.
    CHECK_THAT(to_markdown(table),
               Catch::Contains("| velocity | km/s | < 370 (95 %) | 0 to 370 |") &&
                   Catch::Contains("dipole of lantern | 10⁻³ | < 3.46 (95 %) | 0 to 3.46 |"));
    CHECK_THAT(to_latex(table), Catch::Contains("\\textless{} 370 (95 \\%) & $0$ to $370$"));
    CHECK_THAT(to_html(table), Catch::Contains("&lt; 370 (95 %)"));
}

TEST_CASE("the table of bins has every bin, and says what is fixed", "[summary]") {
    const ResultTable table = bins_table(example::summary());
    REQUIRE(table.rows.size() == 3);
    CHECK_THAT(to_latex(table), Catch::Contains("$1\\,234\\,567$") && Catch::Contains("fixed"));
    CHECK_THAT(to_markdown(table), Catch::Contains("1 234 567"));
    for (const auto& row : table.rows) CHECK(row.size() == table.header.size());
}

TEST_CASE("texts that LaTeX would misread are escaped", "[summary]") {
    CHECK(latex_text("50 % of a_b & #1 {x} \\ ~ ^ $") ==
          "50 \\% of a\\_b \\& \\#1 \\{x\\} \\textbackslash  \\textasciitilde{} "
          "\\textasciicircum{} \\$");
    CHECK(latex_text("10⁻³ ± 2° …") == "$10^{-3}$ $\\pm$ 2$^{\\circ}$ \\dots{}");
}

TEST_CASE("the method text has the run's numbers, and a reference for each citation",
          "[summary]") {
    Chain chain;
    chain.provenance = test::example_provenance();
    Summary summary = example::summary();
    const std::string text = method_text(summary, chain);
    CHECK_THAT(text, Catch::Contains("$1\\,679\\,010$ sources in 3 bins of 2 surveys"));
    CHECK_THAT(text, Catch::Contains("seed 20260817") && Catch::Contains("1.031 over walkers"));
    const std::string references = references_bib();
    std::size_t n_cited = 0;
    for (std::size_t at = 0; (at = text.find("\\cite{", at)) != std::string::npos; ++n_cited) {
        at += 6;
        const std::string key = text.substr(at, text.find('}', at) - at);
        CHECK_THAT(references, Catch::Contains("@article{" + key + ","));
    }
    CHECK(n_cited == 6);
    summary.sampling.converged = false;
    CHECK_THAT(method_text(summary, chain), Catch::Contains("must not be published"));
    CHECK_THAT(results_table(summary).caption, Catch::Contains("NOT converged"));
}
