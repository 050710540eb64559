// SPDX-License-Identifier: GPL-2.0-or-later
#include "job/survey_reader.h"

#include <fmt/format.h>

#include <algorithm>
#include <cstdlib>
#include <limits>
#include <set>

#include "job/frame_reader.h"
#include "job/selection_reader.h"
#include "job/weight_reader.h"

namespace deviascope {

namespace {

std::vector<std::filesystem::path> read_catalogue(const TomlTable& survey,
                                                  Surroundings& surroundings) {
    std::vector<std::filesystem::path> paths;
    std::set<std::string> seen;
    for (const std::string& written : survey.texts("catalogue")) {
        paths.push_back(surroundings.input(survey, "catalogue", written));
        if (seen.insert(written).second) continue;
        survey.fault("catalogue",
                     fmt::format("\"{}\" is named twice", written),
                     "each file once is allowed",
                     "its sources would count twice");
    }
    return paths;
}

/// HDU name or number, or HDF5 group, as text.
std::optional<std::string> read_table_name(const TomlTable& survey) {
    if (!survey.has("table") || survey.has_text("table")) return survey.text("table");
    constexpr std::int64_t most = std::numeric_limits<std::int32_t>::max();
    const auto number = survey.integer("table", 0, most);
    return number ? std::optional(std::to_string(*number)) : std::nullopt;
}

/// The number of a text like `0.05*(1+z)`: of at least 0, times (1+z); blanks do not matter.
std::optional<double> factor_of_one_plus_z(std::string text) {
    text.erase(std::remove(text.begin(), text.end(), ' '), text.end());
    const std::string ending = "*(1+z)";
    if (!text.ends_with(ending)) return std::nullopt;
    const std::string factor = text.substr(0, text.size() - ending.size());
    const bool plain = factor.find_first_not_of("0123456789.eE+-") == std::string::npos;
    if (factor.empty() || !plain) return std::nullopt;
    char* end = nullptr;
    const double value = std::strtod(factor.c_str(), &end);
    return *end == '\0' && at_least(0).holds(value) ? std::optional(value) : std::nullopt;
}

std::map<std::string, PropertyError> read_scatter(const TomlTable& survey,
                                                  const Columns& columns) {
    std::map<std::string, PropertyError> errors;
    const TomlTable scatter = survey.table("scatter");
    for (const std::string& property : scatter.keys()) {
        if (!names_property(scatter, property, columns)) continue;
        if (property == "redshift" && scatter.has_text(property)) {
            const auto factor = factor_of_one_plus_z(scatter.text(property).value_or(""));
            if (factor) errors[property] = {*factor, true};
            if (!factor) scatter.wrong(property, "a number or the form \"0.05*(1+z)\"");
        } else if (const auto sd = scatter.number(property, at_least(0))) {
            errors[property] = {*sd, false};
        }
    }
    return errors;
}

std::optional<SpectralIndex> read_alpha(const TomlTable& survey) {
    if (!survey.has("alpha")) return std::nullopt;
    const TomlTable alpha = survey.table("alpha");
    const auto mean = alpha.number("mean", {}, required);
    const auto sd = alpha.number("sd", at_least(0), required);
    return mean && sd ? std::optional(SpectralIndex{*mean, *sd}) : std::nullopt;
}

BadRows read_bad_rows(const TomlTable& survey) {
    return survey.choice("bad_rows", {"stop", "skip"}) == std::size_t{1} ? BadRows::skip
                                                                         : BadRows::stop;
}

/// All of a survey but its bins and what the model needs.
SurveyInput read_input(const TomlTable& survey, NameRule& names, Surroundings& surroundings) {
    SurveyInput input;
    input.name = names.read(survey);
    const Presence presence = survey.has("catalogue") ? required : Presence::optional;
    input.catalogue = read_catalogue(survey, surroundings);
    input.table = read_table_name(survey);
    input.frame = read_frame(survey, "frame", presence).value_or(Frame::icrs);
    input.columns = read_columns(survey, presence);
    input.exposure = surroundings.optional_input(survey, "exposure");
    input.map_frame = read_frame(survey, "map_frame");
    input.exclude = read_exclusions(survey);
    input.select = read_select(survey, input.columns);
    input.bad_rows = read_bad_rows(survey);
    return input;
}

void check_source_of_counts(const TomlTable& bin, bool has_catalogue) {
    const bool select = bin.has("select"), counts = bin.has("counts");
    if (select && counts) {
        bin.fault("counts", "given besides select", "one of select and counts is allowed");
    } else if (!select && !counts) {
        bin.fault("select", "missing", "select (a table) or counts (a map) is required");
    } else if (select && !has_catalogue) {
        bin.fault(
            "select", "the survey has no catalogue", "select needs one", "or give counts");
    }
}

BinInput read_bin_input(const TomlTable& bin,
                        const SurveyInput& survey,
                        bool has_catalogue,
                        NameRule& names,
                        Surroundings& surroundings) {
    BinInput input;
    input.name = names.read(bin);
    check_source_of_counts(bin, has_catalogue);
    if (has_catalogue) {
        input.select = read_select(bin, survey.columns);
    } else {
        bin.table("select").ignore_unknown_keys();
    }
    input.counts = surroundings.optional_input(bin, "counts");
    input.exposure = surroundings.optional_input(bin, "exposure");
    return input;
}

bool asks_for_dispersion(const TomlTable& bin) {
    return bin.has_text("dispersion") && bin.text("dispersion") == "measure";
}

BinModel read_bin_model(const TomlTable& bin) {
    BinModel model;
    model.bias_ratio = bin.number("bias", at_least(0)).value_or(1.0);
    if (!asks_for_dispersion(bin))
        model.dispersion = bin.number("dispersion", above(0)).value_or(1.0);
    return model;
}

/// A fixed dipole times the bias of a bin must stay shorter than 1.
void check_wall(const TomlTable& bin, double bias, const std::optional<VectorPrior>& prior) {
    const auto* fixed = prior ? std::get_if<FixedPrior>(&prior->kind()) : nullptr;
    if (fixed != nullptr && bias * fixed->value.norm() >= 1.0)
        bin.wrong(
            "bias",
            fmt::format("a number below {:.6g}, the inverse of the fixed intrinsic dipole,",
                        1.0 / fixed->value.norm()));
}

/// Bins that can be measured: those that select from the catalogue; where the job asks for
/// measured weights, only those without a weight of their own.
std::vector<std::size_t> bins_to_weigh(const SurveyInput& survey,
                                       const std::vector<TomlTable>& bins,
                                       bool asked_for) {
    std::vector<std::size_t> found;
    for (std::size_t b = 0; b < bins.size(); ++b) {
        if (survey.bins[b].counts || survey.catalogue.empty()) continue;
        if (!asked_for || !bins[b].has("weight")) found.push_back(b);
    }
    return found;
}

/// Edges in flux and magnitude have weights only with a spectral index.
void check_spectral_index(const TomlTable& survey, const SurveyReading& reading) {
    if (reading.weighing.physics.alpha || survey.has("alpha")) return;
    if (reading.input.columns.contains("alpha")) return;
    const auto needs_index = [](const std::vector<PropertyRange>& ranges) {
        return std::any_of(ranges.begin(), ranges.end(), [](const PropertyRange& range) {
            return range.property == "flux" || range.property == "magnitude";
        });
    };
    bool needed = needs_index(reading.input.select);
    for (const std::size_t bin : reading.weighing.bins)
        needed = needed || needs_index(reading.input.bins[bin].select);
    if (needed && !reading.weighing.bins.empty())
        survey.fault(
            "alpha",
            "missing",
            "to measure weights at edges of flux or magnitude, alpha = { mean, sd } or a "
            "column alpha is required",
            "alpha = 1 for bolometric fluxes and magnitudes");
}

/// The survey's own intrinsic prior, else the job's.
std::optional<VectorPrior> read_own_prior(const TomlTable& survey,
                                          const std::optional<VectorPrior>& intrinsic,
                                          bool intrinsic_shared,
                                          Frame job_frame,
                                          Surroundings& surroundings) {
    if (!survey.has("prior")) return intrinsic;
    if (intrinsic_shared) {
        survey.refuse("prior",
                      "given although intrinsic.shared = true gives all surveys one vector",
                      "leave it out, or write shared = false");
        return intrinsic;
    }
    return surroundings.read_prior(survey, "prior", job_frame, required);
}

}  // namespace

SurveyReading read_survey(const TomlTable& table,
                          NameRule& names,
                          const std::optional<VectorPrior>& intrinsic,
                          bool intrinsic_shared,
                          Frame job_frame,
                          Surroundings& surroundings) {
    SurveyReading reading;
    reading.input = read_input(table, names, surroundings);
    reading.weighing.physics.alpha = read_alpha(table);
    reading.weighing.physics.scatter = read_scatter(table, reading.input.columns);
    const auto prior =
        read_own_prior(table, intrinsic, intrinsic_shared, job_frame, surroundings);
    if (prior) reading.model.intrinsic = *prior;
    const std::vector<TomlTable> bins = table.tables("bin", required);
    std::vector<std::string> bin_names;
    NameRule bin_rule;
    for (const TomlTable& bin : bins) {
        reading.input.bins.push_back(
            read_bin_input(bin, reading.input, table.has("catalogue"), bin_rule, surroundings));
        reading.model.bins.push_back(read_bin_model(bin));
        if (asks_for_dispersion(bin))
            reading.measure_dispersion.push_back(reading.model.bins.size() - 1);
        check_wall(bin, reading.model.bins.back().bias_ratio, prior);
        bin_names.push_back(reading.input.bins.back().name);
    }
    WeightReading weights =
        read_weights(table, reading.input.name, bins, bin_names, surroundings);
    reading.weighing.asked_for = weights.measure;
    reading.weighing.unmeasured = weights.unmeasured;
    reading.weighing.bins = bins_to_weigh(reading.input, bins, weights.measure);
    if (weights.measure) check_spectral_index(table, reading);
    if (weights.prior) reading.model.weights = *weights.prior;
    reading.warnings = std::move(weights.warnings);
    reading.model_complete = prior && weights.prior && !bins.empty();
    return reading;
}

}  // namespace deviascope
