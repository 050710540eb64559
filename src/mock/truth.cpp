// SPDX-License-Identifier: GPL-2.0-or-later
#include <fmt/format.h>

#include <string>

#include "deviascope/core/error.h"
#include "deviascope/core/physical_constants.h"
#include "deviascope/core/version.h"
#include "deviascope/mock/expectation.h"
#include "deviascope/mock/write_mock.h"

namespace deviascope {

namespace {

/// TOML 1.0 basic string.
std::string quoted(const std::string& text) {
    std::string out = "\"";
    for (const char c : text) {
        const auto byte = static_cast<unsigned char>(c);
        if (c == '"' || c == '\\')
            out += {'\\', c};
        else if (byte < 0x20 || byte == 0x7f)
            out += fmt::format("\\u{:04x}", byte);
        else
            out += c;
    }
    return out + '"';
}

/// A TOML float: fmt's shortest form needs a point or an exponent to be one.
std::string number(double value) {
    std::string text = fmt::format("{}", value);
    if (text.find_first_of(".einf") == std::string::npos) text += ".0";
    return text;
}

std::string vector_text(const Eigen::Vector3d& vector) {
    return fmt::format(
        "[{}, {}, {}]", number(vector.x()), number(vector.y()), number(vector.z()));
}

std::string direction_lines(const Eigen::Vector3d& vector, Frame frame) {
    if (vector.isZero(0.0)) return "";
    std::string text;
    for (const std::string& name : frame_names()) {
        const LonLat direction = lon_lat_of(rotation(frame, *frame_of_name(name)) * vector);
        text += fmt::format("{} = {{ lon_deg = {}, lat_deg = {} }}\n",
                            name,
                            number(direction.lon_deg),
                            number(direction.lat_deg));
    }
    return text;
}

std::string velocity_text(const Scenario& scenario) {
    const double beta = scenario.velocity.norm();
    return fmt::format(
               "\n[velocity]  # units of c, frame of [mock]\nvector = {}\n"
               "amplitude = {}\nspeed_km_s = {}\n",
               vector_text(scenario.velocity),
               number(beta),
               number(beta * speed_of_light_km_s)) +
           direction_lines(scenario.velocity, scenario.frame);
}

std::string keep_text(const MockSurvey& survey) {
    std::string text;
    for (const KeptRange& range : survey.keep)
        text += fmt::format("{}{} = [{}, {}]",
                            text.empty() ? "" : ", ",
                            name_of(range.property),
                            number(range.low),
                            number(range.high));
    return "{ " + text + " }";
}

std::string excluded_text(const MockSurvey& survey, const MockTally& tally) {
    std::string text;
    for (std::size_t number = 0; number < survey.exclude.size(); ++number)
        text += fmt::format("    {{ region = {}, sources = {} }},\n",
                            quoted(survey.exclude[number].label()),
                            tally.excluded[number]);
    return text.empty() ? "[]" : "[\n" + text + "]";
}

std::string tally_text(const MockSurvey& survey, const MockTally& tally) {
    return fmt::format(
        "\n[survey.sources]  # drawn = outside_keep + excluded + thinned + kept\n"
        "mean = {}\ndrawn = {}\noutside_keep = {}\nexcluded = {}\nthinned = {}\nkept = "
        "{}\nrows = {}\n",
        number(survey.sources),
        tally.drawn,
        tally.outside_kept_range,
        excluded_text(survey, tally),
        tally.thinned,
        tally.kept,
        tally.rows);
}

std::string survey_text(const Scenario& scenario,
                        const MockSurvey& survey,
                        const MockTally& tally) {
    std::string text =
        fmt::format("\n[[survey]]\nname = {}\nfile = {}\nframe = {}  # of the positions\n",
                    quoted(survey.name),
                    quoted(survey.catalogue_file()),
                    quoted(name_of(survey.output.frame)));
    if (!survey.keep.empty()) text += fmt::format("keep = {}\n", keep_text(survey));
    if (const auto weight = expected_weight(survey, survey.keep))
        text += fmt::format("kinematic_weight = {}  # first order, all kept sources\n",
                            number(*weight));
    text += fmt::format("dispersion = {}  # variance over mean of rows in a pixel\n",
                        number(expected_dispersion(survey)));
    text += fmt::format(
        "\n[survey.intrinsic]  # density of sources, frame of [mock]\n"
        "vector = {}\namplitude = {}\n",
        vector_text(survey.intrinsic),
        number(survey.intrinsic.norm()));
    return text + direction_lines(survey.intrinsic, scenario.frame) + tally_text(survey, tally);
}

std::string warnings_text(const Scenario& scenario) {
    std::string text;
    for (const std::string& warning : scenario.warnings())
        text += fmt::format("    {},\n", quoted(warning));
    return text.empty() ? "warnings = []\n" : "warnings = [\n" + text + "]\n";
}

}  // namespace

std::string truth_text(const Scenario& scenario, const std::vector<MockTally>& tally) {
    ensure(tally.size() == scenario.surveys.size(), "there is one tally a survey");
    std::string text = fmt::format(
        "# What this mock sky was made with. Sources are invented.\n"
        "[mock]\ntitle = {}\nversion = {}\nseed = {}\nframe = {}\n",
        quoted(scenario.title),
        quoted(version()),
        scenario.seed,
        quoted(name_of(scenario.frame)));
    text += warnings_text(scenario);
    text += velocity_text(scenario);
    for (std::size_t survey = 0; survey < scenario.surveys.size(); ++survey)
        text += survey_text(scenario, scenario.surveys[survey], tally[survey]);
    return text;
}

}  // namespace deviascope
