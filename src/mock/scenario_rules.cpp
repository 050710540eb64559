// SPDX-License-Identifier: GPL-2.0-or-later
#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <set>

#include "deviascope/sky/boost.h"
#include "deviascope/mock/scenario.h"
#include "deviascope/sky/pixelisation.h"

namespace deviascope {

namespace {

/// Standard deviations of alpha and of scatter within which no source may be missed: one in
/// 5e8 lies beyond, on one side.
constexpr double margin_sd = 6.0;

/// Collects the faults of one place of a scenario.
class Faults {
  public:
    Faults(std::vector<Message>& messages, std::string place)
        : messages_(messages), place_(std::move(place)) {}

    void add(const std::string& key,
             const std::string& found,
             const std::string& allowed,
             const std::string& remedy = "") {
        messages_.push_back({fmt::format("{}{}", place_, key), found, allowed, remedy});
    }
    void positive(const std::string& key, double value) {
        if (!(value > 0.0) || std::isinf(value))
            add(key, fmt::format("{}", value), "a finite number above 0 is needed");
    }
    void not_negative(const std::string& key, double value) {
        if (!(value >= 0.0) || std::isinf(value))
            add(key, fmt::format("{}", value), "a finite number, 0 or more, is needed");
    }
    void finite(const std::string& key, double value) {
        if (!std::isfinite(value))
            add(key, fmt::format("{}", value), "a finite number is needed");
    }
    void shorter_than_one(const std::string& key, const Eigen::Vector3d& vector) {
        if (!(vector.norm() < 1.0))
            add(key,
                fmt::format("length {}", vector.norm()),
                "the length of the vector must be below 1");
    }

  private:
    std::vector<Message>& messages_;
    std::string place_;
};

void check(const PowerLawFlux& law, Faults& faults) {
    faults.positive("flux.slope", law.slope);
}
void check(const BrokenPowerLawFlux& law, Faults& faults) {
    faults.positive("flux.faint_slope", law.faint_slope);
    faults.positive("flux.bright_slope", law.bright_slope);
    if (!(law.break_flux > law.minimum))
        faults.add("flux.break", fmt::format("{}", law.break_flux), "it must exceed minimum");
}
void check(const DoublePowerLawFlux& law, Faults& faults) {
    faults.positive("flux.turn", law.turn_flux);
    faults.positive("flux.faint_slope", law.faint_slope);
    if (!(law.bright_slope > law.faint_slope) || std::isinf(law.bright_slope))
        faults.add("flux.bright_slope",
                   fmt::format("{}", law.bright_slope),
                   "it must exceed faint_slope");
}

void check_population(const MockSurvey& survey, Faults& faults) {
    faults.finite("alpha.mean", survey.alpha.mean);
    faults.not_negative("alpha.sd", survey.alpha.sd);
    if (survey.flux) {
        faults.positive("flux.minimum", minimum_flux(*survey.flux));
        std::visit([&](const auto& law) { check(law, faults); }, *survey.flux);
    }
    if (survey.redshift) {
        faults.positive("redshift.scale", survey.redshift->scale);
        faults.positive("redshift.power", survey.redshift->power);
    }
    if (survey.magnitude) {
        faults.positive("magnitude.slope", survey.magnitude->slope);
        faults.finite("magnitude.limit", survey.magnitude->limit);
    }
    if (survey.size) {
        faults.positive("size.median", survey.size->median);
        faults.positive("size.sd_ln", survey.size->sd_ln);
    }
}

void check_measurement(const MockSurvey& survey, Faults& faults) {
    for (std::size_t number = 0; number < n_properties; ++number) {
        const auto property = static_cast<Property>(number);
        const std::string key = "scatter." + name_of(property);
        faults.not_negative(key, survey.scatter_of(property));
        if (survey.scatter_of(property) > 0.0 && !survey.has(property))
            faults.add(key, "the survey does not have this property", "", "leave it out");
    }
    faults.not_negative("extra_components", survey.extra_components);
}

void check_ranges(const MockSurvey& survey, Faults& faults) {
    std::set<Property> seen;
    for (const KeptRange& range : survey.keep) {
        const std::string key = "keep." + name_of(range.property);
        if (!survey.has(range.property))
            faults.add(key, "the survey does not have this property", "", "leave it out");
        if (!seen.insert(range.property).second)
            faults.add(key, "named twice", "one range a property", "");
        if (!(range.low < range.high))
            faults.add(key,
                       fmt::format("[{}, {}]", range.low, range.high),
                       "the first number must be below the second");
    }
}

/// Largest and smallest (1 + alpha) ln delta of any source within margin_sd.
struct Reach {
    double up = 0.0, down = 0.0;
};
Reach reach_of(const Scenario& scenario, const MockSurvey& survey) {
    const double beta = scenario.velocity.norm();
    const double log_delta = std::log(Boost(scenario.velocity).gamma() * (1.0 + beta));
    const double spread = margin_sd * survey.alpha.sd;
    const double largest = std::max(std::abs(1.0 + survey.alpha.mean + spread),
                                    std::abs(1.0 + survey.alpha.mean - spread));
    return {largest * log_delta, -largest * log_delta};
}

void check_flux_margin(const MockSurvey& survey, const Reach& reach, Faults& faults) {
    const double limit = survey.kept_range(Property::flux).low;
    const double minimum = minimum_flux(*survey.flux);
    const double most = std::exp(reach.up) * (1.0 + margin_sd * survey.scatter.flux);
    if (std::isinf(limit) || minimum * most <= limit) return;
    faults.add("flux.minimum",
               fmt::format("{} is too near the limit {} of keep.flux", minimum, limit),
               fmt::format("at most {:.6g}, so that boost and scatter bring in every source "
                           "that belongs above the limit",
                           limit / most),
               "lower minimum and raise sources by the same law");
}

void check_magnitude_margin(const MockSurvey& survey, const Reach& reach, Faults& faults) {
    const double limit = survey.kept_range(Property::magnitude).high;
    const double drawn_to = survey.magnitude->limit;
    const double most =
        2.5 * std::log10(std::exp(1.0)) * reach.up + margin_sd * survey.scatter.magnitude;
    if (std::isinf(limit) || drawn_to - most >= limit) return;
    faults.add("magnitude.limit",
               fmt::format("{} is too near the limit {} of keep.magnitude", drawn_to, limit),
               fmt::format("at least {:.6g}, so that boost and scatter bring in every source "
                           "that belongs inside the limit",
                           limit + most),
               "raise limit and sources by the same law");
}

void check_margins(const Scenario& scenario, const MockSurvey& survey, Faults& faults) {
    const Reach reach = reach_of(scenario, survey);
    if (survey.flux) check_flux_margin(survey, reach, faults);
    if (survey.magnitude) check_magnitude_margin(survey, reach, faults);
}

bool is_file_name(const std::string& name, bool fits_only) {
    if (name.empty() || name.find('/') != std::string::npos) return false;
    return name.ends_with(".fits") || (!fits_only && name.ends_with(".csv"));
}

void check_columns(const MockSurvey& survey, Faults& faults) {
    std::vector<std::string> names = {survey.lon_column(), survey.lat_column()};
    for (const PropertyColumn& column : survey.property_columns()) {
        names.push_back(column.name);
        if (!survey.has(column.property))
            faults.add("columns." + name_of(column.property),
                       "the survey does not have this property",
                       "",
                       "leave it out");
    }
    std::set<std::string> seen;
    for (std::string& name : names) {
        const bool printable =
            std::all_of(name.begin(), name.end(), [](char c) { return c >= ' ' && c <= '~'; });
        if (name.empty() || name.size() > 68 || !printable)
            faults.add("columns",
                       fmt::format("\"{}\"", name),
                       "a column name has 1 to 68 printable ASCII characters");
        for (char& c : name)
            if (c >= 'a' && c <= 'z') c = static_cast<char>(c - 'a' + 'A');
        if (!seen.insert(name).second)
            faults.add("columns",
                       fmt::format("{} is used twice (case is ignored)", name),
                       "every column needs a name of its own");
    }
}

void check_exposure(const MockSurvey& survey, Faults& faults) {
    const auto* gradient =
        survey.exposure ? std::get_if<ExposureGradient>(&*survey.exposure) : nullptr;
    if (gradient == nullptr) return;
    if (!(gradient->lowest >= 0.0 && gradient->lowest <= 1.0))
        faults.add("exposure.lowest", fmt::format("{}", gradient->lowest), "0 to 1 is needed");
    if (!Pixelisation::is_valid_nside(gradient->nside))
        faults.add("exposure.nside",
                   fmt::format("{}", gradient->nside),
                   fmt::format("a power of two, 1 to {}, is needed", Pixelisation::max_nside));
    faults.finite("exposure.lon", gradient->lon_deg);
    faults.finite("exposure.lat", gradient->lat_deg);
    if (!is_file_name(survey.exposure_file(), true))
        faults.add("exposure.file",
                   fmt::format("\"{}\"", survey.exposure_file()),
                   "a name without folders that ends in .fits is needed");
}

bool is_survey_name(const std::string& name) {
    return !name.empty() && name != "all" && std::all_of(name.begin(), name.end(), [](char c) {
        return (c >= 'a' && c <= 'z') || (c >= '0' && c <= '9') || c == '-';
    });
}

void check_survey(const Scenario& scenario,
                  const MockSurvey& survey,
                  std::vector<Message>& messages) {
    Faults faults(messages, fmt::format("survey \"{}\", ", survey.name));
    if (!is_survey_name(survey.name))
        faults.add("name",
                   fmt::format("\"{}\"", survey.name),
                   "letters a-z, digits and hyphens, and not \"all\"");
    // Boost.Random's Poisson variates are exact only well inside the 53 bits of a double.
    if (!(survey.sources > 0.0) || survey.sources > 1e12)
        faults.add("sources",
                   fmt::format("{}", survey.sources),
                   "a mean number above 0 and up to 1e12 is needed");
    faults.shorter_than_one("intrinsic", survey.intrinsic);
    const std::size_t before = messages.size();
    check_population(survey, faults);
    check_measurement(survey, faults);
    check_ranges(survey, faults);
    if (messages.size() == before && scenario.velocity.norm() < 1.0)
        check_margins(scenario, survey, faults);
    check_columns(survey, faults);
    check_exposure(survey, faults);
    if (!is_file_name(survey.catalogue_file(), false))
        faults.add("file",
                   fmt::format("\"{}\"", survey.catalogue_file()),
                   "a name without folders that ends in .fits or .csv is needed");
}

void check_unlike(std::set<std::string>& seen,
                  const std::string& name,
                  const std::string& what,
                  std::vector<Message>& messages) {
    if (name.empty() || seen.insert(name).second) return;
    messages.push_back({"surveys",
                        fmt::format("the {} \"{}\" is used twice", what, name),
                        "every one needs a name of its own",
                        ""});
}

}  // namespace

std::vector<Message> Scenario::problems() const {
    std::vector<Message> messages;
    Faults faults(messages, "");
    if (seed > static_cast<std::uint64_t>(std::numeric_limits<std::int64_t>::max()))
        faults.add("seed", fmt::format("{}", seed), "0 to 2^63-1 is allowed");
    faults.shorter_than_one("velocity", velocity);
    if (surveys.empty()) faults.add("surveys", "there is none", "at least one is needed");
    std::set<std::string> names;
    std::set<std::string> files = {"truth.toml"};
    for (const MockSurvey& survey : surveys) {
        check_survey(*this, survey, messages);
        check_unlike(names, survey.name, "name", messages);
        check_unlike(files, survey.catalogue_file(), "file", messages);
        check_unlike(files, survey.exposure_file(), "file", messages);
    }
    return messages;
}

std::vector<std::string> Scenario::warnings() const {
    std::vector<std::string> warnings;
    for (const MockSurvey& survey : surveys) {
        if (survey.flux && !std::isfinite(survey.kept_range(Property::flux).low))
            warnings.push_back(fmt::format(
                "{}: keep names no lower flux limit: the catalogue ends where the sources "
                "end, the same sources on every side, so their flux adds nothing to the "
                "kinematic dipole; cut the catalogue well above flux.minimum",
                survey.name));
        if (survey.magnitude && !std::isfinite(survey.kept_range(Property::magnitude).high))
            warnings.push_back(fmt::format(
                "{}: keep names no faint magnitude limit: the catalogue ends where the "
                "sources end, so their magnitude adds nothing to the kinematic dipole; cut "
                "the catalogue well above magnitude.limit",
                survey.name));
    }
    return warnings;
}

}  // namespace deviascope
