// SPDX-License-Identifier: GPL-2.0-or-later
// Every figure of posteriors that are hard to draw: labels, numbers, bytes.
#include <catch2/catch.hpp>
#include <cstdlib>
#include <fstream>
#include <regex>
#include <set>

#include "deviascope/figures/report.h"
#include "deviascope/summary/result_tables.h"
#include "figures/sheet.h"
#include "hard_posteriors.h"
#include "posed_comparison.h"

using namespace deviascope;
using deviascope::test::hard_posteriors;
using deviascope::test::HardPosterior;
using deviascope::test::PosedPosterior;

namespace {

std::vector<Sheet> all_sheets(const FigureContext& context) {
    std::vector<Sheet> sheets;
    for (const auto draw : {direction_sheets,
                            residual_sheets,
                            amplitude_sheets,
                            joint_sheets,
                            profile_sheets,
                            weight_sheets,
                            trace_sheets,
                            hypothesis_sheets,
                            survey_sheets})
        for (Sheet& sheet : draw(context)) sheets.push_back(std::move(sheet));
    return sheets;
}

std::string words_of(const Text& text) {
    std::string words;
    for (const Run& run : text.runs) words += run.text;
    return words;
}

/// The box of a text, turned ones too.
Box box_on_page(const Text& text, const Fonts& fonts) {
    if (text.turn_deg == 0.0) return box_of(text, fonts);
    const double half = 0.5 * fonts.width(text.runs, text.size);
    return {text.at.x - 0.8 * text.size, text.at.y - half, text.at.x, text.at.y + half};
}

void check_texts(const Sheet& sheet, const Fonts& fonts) {
    std::vector<std::pair<std::string, Box>> boxes;
    for (const Item& item : sheet.drawing.items)
        if (const auto* text = std::get_if<Text>(&item); text != nullptr)
            if (!words_of(*text).empty())
                boxes.emplace_back(words_of(*text), box_on_page(*text, fonts));
    for (std::size_t a = 0; a < boxes.size(); ++a) {
        const auto& [words, box] = boxes[a];
        INFO(sheet.name << ": \"" << words << "\"");
        CHECK(box.left >= -0.01);
        CHECK(box.right <= sheet.drawing.width + 0.01);
        CHECK(box.top >= -0.01);
        CHECK(box.bottom <= sheet.drawing.height + 0.01);
        CHECK_FALSE(std::regex_search(words, std::regex("(-|−)0(\\.0*)?(?![0-9.])|nan|inf")));
        for (std::size_t b = a + 1; b < boxes.size(); ++b) {
            INFO("and \"" << boxes[b].first << "\"");
            CHECK_FALSE(box.overlaps(boxes[b].second.grown(-0.4)));
        }
    }
}

/// For a look at the figures: PNGs go to the folder that this variable names.
void keep_for_a_look(const std::string& name,
                     double width,
                     const std::vector<Figure>& figures) {
    const char* folder = std::getenv("DEVIASCOPE_LOOK");
    if (folder == nullptr) return;
    for (const Figure& figure : figures)
        std::ofstream(std::filesystem::path(folder) / (name + "-" + std::to_string(int(width)) +
                                                       "-" + figure.name + ".png"),
                      std::ios::binary)
            << figure.png;
}

}  // namespace

TEST_CASE("figures of hard posteriors have no colliding, lost or senseless labels",
          "[figures]") {
    const Fonts fonts;
    for (const HardPosterior& hard : hard_posteriors()) {
        INFO(hard.name);
        const PosedPosterior posed(hard.pose);
        FigureSource source = posed.source();
        const Comparison comparison = test::posed_comparison(hard.pose.surveys);
        source.comparison = &comparison;
        for (const double width : {90.0, 180.0}) {
            FigureOptions options;
            options.width_mm = width;
            const FigureContext context{source, options, fonts};
            for (const Sheet& sheet : all_sheets(context)) check_texts(sheet, fonts);
            if (std::getenv("DEVIASCOPE_LOOK") != nullptr)
                keep_for_a_look(hard.name, width, make_figures(source, options));
        }
    }
}

TEST_CASE("figures have words for every number, and the same bytes every time", "[figures]") {
    const PosedPosterior posed(hard_posteriors()[9].pose);
    const Comparison comparison = test::posed_comparison({"dunlin", "lantern"});
    FigureSource source = posed.source();
    source.comparison = &comparison;
    FigureOptions options;
    const auto first = make_figures(source, options);
    options.threads = 3;
    const auto second = make_figures(source, options);
    REQUIRE(first.size() == second.size());
    std::set<std::string> names;
    for (std::size_t figure = 0; figure < first.size(); ++figure) {
        const Figure& one = first[figure];
        INFO(one.name);
        names.insert(one.name);
        CHECK(one.svg == second[figure].svg);
        CHECK(one.pdf == second[figure].pdf);
        CHECK(one.png == second[figure].png);
        CHECK(one.csv == second[figure].csv);
        CHECK(one.csv.find('\n') + 1 < one.csv.size());
        CHECK(one.alternative.find_first_of("0123456789") != std::string::npos);
        CHECK(!one.reading_aid.empty());
        CHECK(one.inlined_svg.find("id=\"" + one.name + "-title\"") != std::string::npos);
    }
    CHECK(names == std::set<std::string>{"directions",
                                         "residuals-dunlin",
                                         "residuals-lantern",
                                         "amplitudes",
                                         "joint",
                                         "hypotheses",
                                         "surveys",
                                         "profile-dunlin",
                                         "profile-lantern",
                                         "weights",
                                         "traces"});
}

TEST_CASE("figure, table and summary quote the same upper limit", "[figures]") {
    const PosedPosterior posed({test::tiny(), {test::one_sided()}, {"dunlin"}});
    REQUIRE(posed.summary().intrinsic[0].amplitude_limits);
    const std::string table = to_html(results_table(posed.summary()));
    std::smatch quoted;
    REQUIRE(std::regex_search(table, quoted, std::regex("&lt; [0-9.]+ \\(95 %\\)")));
    FigureOptions options;
    options.only = {"amplitudes"};
    CHECK_THAT(make_figures(posed.source(), options)[0].svg, Catch::Contains(quoted.str()));
    CHECK_THAT(report_html(posed.source(), make_figures(posed.source(), {})),
               Catch::Contains("an amplitude of less than " + quoted.str().substr(5)));
}

TEST_CASE("figures are chosen by the beginnings of their names, parameters by name",
          "[figures]") {
    const PosedPosterior posed(hard_posteriors()[9].pose);
    FigureOptions options;
    options.only = {"residuals", "weights"};
    const auto figures = make_figures(posed.source(), options);
    REQUIRE(figures.size() == 3);
    CHECK(figures[0].name == "residuals-dunlin");
    CHECK(figures[2].name == "weights");

    options.only = {"jiont"};
    CHECK_THROWS_WITH(
        make_figures(posed.source(), options),
        Catch::Contains("\"jiont\"") && Catch::Contains("did you mean \"joint\""));
    options.only = {"joint"};
    options.parameters = {"velocity.amplitude", "weight.dunlin.faint"};
    CHECK_THAT(make_figures(posed.source(), options)[0].alternative,
               Catch::Contains("speed") && Catch::Contains("weight dunlin faint"));
    options.parameters = {"velocity.w"};
    CHECK_THROWS_WITH(make_figures(posed.source(), options),
                      Catch::Contains("\"velocity.w\" is not in the chain"));
    options.width_mm = 90.0;
    options.parameters = {
        "velocity.x", "velocity.y", "velocity.z", "intrinsic.dunlin.x", "intrinsic.dunlin.y"};
    CHECK_THROWS_WITH(make_figures(posed.source(), options), Catch::Contains("5 parameters"));
    options.width_mm = 300.0;
    CHECK_THROWS_WITH(make_figures(posed.source(), options), Catch::Contains("--width"));
}

TEST_CASE("a run that did not converge says so in every figure", "[figures]") {
    PosedPosterior posed(hard_posteriors()[9].pose);
    posed.summary().sampling.converged = false;
    for (const Figure& figure : make_figures(posed.source(), {})) {
        INFO(figure.name);
        CHECK_THAT(figure.svg, Catch::Contains("has not converged"));
    }
}
