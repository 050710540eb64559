// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/job/scenario_file.h"

#include <limits>
#include <utility>

#include "deviascope/core/physical_constants.h"
#include "deviascope/sky/direction.h"
#include "job/frame_reader.h"
#include "job/name_rule.h"
#include "job/selection_reader.h"
#include "job/text_file.h"
#include "job/toml_reader.h"

namespace deviascope {

namespace {

/// A vector as `vector`, or as a length and a direction. The length is `amplitude` or, of a
/// velocity, also `speed_km_s`. Zero where the table is absent.
Eigen::Vector3d read_vector(const TomlTable& table, bool is_velocity) {
    if (!table) return Eigen::Vector3d::Zero();
    if (table.has("vector")) {
        const auto vector = table.numbers("vector", 3, {}, Presence::required);
        return vector ? Eigen::Vector3d(*vector) : Eigen::Vector3d::Zero();
    }
    double length = 0.0;
    if (is_velocity && table.has("speed_km_s"))
        length = table.number("speed_km_s", at_least(0)).value_or(0.0) / speed_of_light_km_s;
    else
        length = table.number("amplitude", at_least(0), Presence::required).value_or(0.0);
    const auto lon = table.number("lon_deg", between(-360, 360), Presence::required);
    const auto lat = table.number("lat_deg", between(-90, 90), Presence::required);
    if (!lon || !lat) return Eigen::Vector3d::Zero();
    return length * direction_of(*lon, *lat);
}

/// A required number of a table; 0 where it is faulty, which is noted then.
double required_number(const TomlTable& table, const std::string& key) {
    return table.number(key, {}, Presence::required).value_or(0.0);
}

std::optional<FluxDistribution> read_flux(const TomlTable& table) {
    if (!table) return {};
    const auto kind = table.choice(
        "kind", {"power-law", "broken-power-law", "double-power-law"}, Presence::required);
    if (!kind) {
        table.ignore_unknown_keys();
        return {};
    }
    const double minimum = required_number(table, "minimum");
    if (*kind == 0) return PowerLawFlux{minimum, required_number(table, "slope")};
    const double turn = required_number(table, *kind == 1 ? "break" : "turn");
    const double faint = required_number(table, "faint_slope");
    const double bright = required_number(table, "bright_slope");
    if (*kind == 1) return BrokenPowerLawFlux{minimum, turn, faint, bright};
    return DoublePowerLawFlux{minimum, turn, faint, bright};
}

void read_population(const TomlTable& table, MockSurvey& survey) {
    if (const TomlTable alpha = table.table("alpha")) {
        survey.alpha.mean = required_number(alpha, "mean");
        survey.alpha.sd = alpha.number("sd").value_or(0.0);
    }
    survey.flux = read_flux(table.table("flux"));
    if (const TomlTable redshift = table.table("redshift"))
        survey.redshift = RedshiftDistribution{required_number(redshift, "scale"),
                                               required_number(redshift, "power")};
    if (const TomlTable magnitude = table.table("magnitude"))
        survey.magnitude = MagnitudeDistribution{required_number(magnitude, "slope"),
                                                 required_number(magnitude, "limit")};
    if (const TomlTable size = table.table("size"))
        survey.size =
            SizeDistribution{required_number(size, "median"), required_number(size, "sd_ln")};
}

void read_measurement(const TomlTable& table, MockSurvey& survey) {
    const TomlTable scatter = table.table("scatter");
    survey.scatter.flux = scatter.number("flux").value_or(0.0);
    survey.scatter.redshift = scatter.number("redshift").value_or(0.0);
    survey.scatter.magnitude = scatter.number("magnitude").value_or(0.0);
    survey.scatter.size = scatter.number("size").value_or(0.0);
    survey.extra_components = table.number("extra_components").value_or(0.0);
}

std::vector<KeptRange> read_keep(const TomlTable& keep) {
    NumberRange any;
    any.infinite = true;
    std::vector<KeptRange> ranges;
    for (const std::string& name : property_names())
        if (const auto ends = keep.numbers(name, 2, any))
            ranges.push_back({*property_of_name(name), (*ends)(0), (*ends)(1)});
    return ranges;
}

ExposureGradient read_gradient(const TomlTable& table) {
    ExposureGradient gradient;
    gradient.lowest = required_number(table, "lowest");
    gradient.lon_deg = required_number(table, "lon_deg");
    gradient.lat_deg = required_number(table, "lat_deg");
    gradient.frame = read_frame(table, "frame", Presence::required).value_or(Frame::icrs);
    gradient.nside = static_cast<int>(
        table.integer("nside", 1, std::numeric_limits<int>::max()).value_or(gradient.nside));
    gradient.file = table.text("file").value_or("");
    return gradient;
}

std::optional<MockExposure> read_exposure(const TomlTable& table,
                                          const std::filesystem::path& folder) {
    const auto map_frame = read_frame(table, "map_frame");
    if (!table.has("exposure")) return {};
    if (table.has_table("exposure")) return read_gradient(table.table("exposure"));
    const auto written = table.text("exposure");
    if (!written) return {};
    ExposureFile file{folder / *written, map_frame};
    if (!std::filesystem::exists(file.path))
        table.wrong("exposure", "a HEALPix map that exists, or a table that describes one");
    return file;
}

void read_columns_written(const TomlTable& table, CatalogueOutput& output) {
    const TomlTable columns = table.table("columns");
    if (!columns) return;
    output.lon_column = columns.text("lon", Presence::required).value_or("");
    output.lat_column = columns.text("lat", Presence::required).value_or("");
    for (const std::string& name : property_names()) columns.has(name);  // makes them known
    output.columns.emplace();
    for (const std::string& name : columns.keys())
        if (const auto property = property_of_name(name))
            output.columns->push_back({*property, columns.text(name).value_or("")});
}

CatalogueOutput read_output(const TomlTable& table) {
    CatalogueOutput output;
    output.file = table.text("file").value_or("");
    output.frame = read_frame(table, "frame").value_or(Frame::icrs);
    output.extension = table.text("table").value_or(output.extension);
    output.single_precision = table.choice("precision", {"double", "single"}) == std::size_t{1};
    read_columns_written(table, output);
    return output;
}

MockSurvey read_survey(const TomlTable& table,
                       NameRule& names,
                       const std::filesystem::path& folder) {
    MockSurvey survey;
    survey.name = names.read(table);
    survey.sources = required_number(table, "sources");
    survey.intrinsic = read_vector(table.table("intrinsic"), false);
    read_population(table, survey);
    read_measurement(table, survey);
    survey.keep = read_keep(table.table("keep"));
    survey.exclude = read_exclusions(table);
    survey.exposure = read_exposure(table, folder);
    survey.output = read_output(table);
    return survey;
}

/// The rules between keys, once the file itself is sound.
void check_rules(const Scenario& scenario, const std::string& name) {
    std::vector<Message> problems = scenario.problems();
    for (Message& problem : problems) problem.place = name + ": " + problem.place;
    if (!problems.empty()) throw UsageError(std::move(problems));
}

}  // namespace

Scenario parse_scenario(const std::string& text,
                        const std::string& name,
                        const std::filesystem::path& folder) {
    TomlDocument document(text, name);
    const TomlTable root = document.root();
    Scenario scenario;
    const TomlTable head = root.table("scenario");
    scenario.title =
        head.text("title").value_or(std::filesystem::path(name).filename().string());
    constexpr std::int64_t largest = std::numeric_limits<std::int64_t>::max();
    scenario.seed = static_cast<std::uint64_t>(
        head.integer("seed", 0, largest, Presence::required).value_or(0));
    scenario.frame = read_frame(head, "frame").value_or(Frame::galactic);
    scenario.velocity = read_vector(root.table("velocity"), true);
    NameRule names({"all"});
    for (const TomlTable& table : root.tables("survey", Presence::required))
        scenario.surveys.push_back(read_survey(table, names, folder));
    document.finish();
    check_rules(scenario, name);
    return scenario;
}

Scenario read_scenario(const std::filesystem::path& path) {
    const auto text = text_of_file(path);
    if (!text)
        throw UsageError({path.string(), "cannot be read", "a scenario file is needed", ""});
    return parse_scenario(*text, path.string(), path.parent_path());
}

}  // namespace deviascope
