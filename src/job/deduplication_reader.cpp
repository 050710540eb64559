// SPDX-License-Identifier: GPL-2.0-or-later
#include "job/deduplication_reader.h"

#include <fmt/format.h>

#include <algorithm>
#include <optional>

namespace deviascope {

namespace {

constexpr const char* key = "deduplicate";
constexpr const char* form =
    "texts of the form \"dunlin over lantern\", two surveys of the job,";

std::optional<std::size_t> place_of(const std::string& name,
                                    const std::vector<SurveyInput>& surveys) {
    const auto found = std::ranges::find(surveys, name, &SurveyInput::name);
    if (found == surveys.end()) return std::nullopt;
    return static_cast<std::size_t>(found - surveys.begin());
}

std::optional<Deduplication> parsed(const std::string& written,
                                    const std::vector<SurveyInput>& surveys) {
    const std::string joint = " over ";
    const std::size_t at = written.find(joint);
    if (at == std::string::npos) return std::nullopt;
    const auto first = place_of(written.substr(0, at), surveys);
    const auto second = place_of(written.substr(at + joint.size()), surveys);
    if (!first || !second || *first == *second) return std::nullopt;
    return Deduplication{*first, *second};
}

/// True where some bin of a survey is counted from its catalogue.
bool has_positions(const SurveyInput& survey) {
    return !survey.catalogue.empty() &&
           std::ranges::any_of(survey.bins, [](const BinInput& bin) { return !bin.counts; });
}

/// Whether `from` depends on `to`: is deduplicated over it, directly or by way of others.
bool depends(std::size_t from, std::size_t to, const std::vector<Deduplication>& all) {
    if (from == to) return true;
    return std::ranges::any_of(all, [&](const Deduplication& one) {
        return one.second == from && depends(one.first, to, all);
    });
}

}  // namespace

std::vector<Deduplication> read_deduplication(const TomlTable& job,
                                              const std::vector<SurveyInput>& surveys) {
    std::vector<Deduplication> all;
    if (!job.has(key)) return all;
    for (const std::string& written : job.texts(key)) {
        const auto one = parsed(written, surveys);
        if (!one) {
            job.fault(
                key, fmt::format("found \"{}\"", written), std::string(form) + " are allowed");
            continue;
        }
        for (const std::size_t survey : {one->first, one->second})
            if (!has_positions(surveys[survey]))
                job.fault(key,
                          fmt::format("found \"{}\": {} has no positions of sources",
                                      written,
                                      surveys[survey].name),
                          "surveys with bins that select from a catalogue are allowed");
        if (depends(one->first, one->second, all)) {
            job.fault(key,
                      fmt::format("found \"{}\", which closes a circle", written),
                      "a survey may not give way to one that gives way to it");
            continue;
        }
        all.push_back(*one);
    }
    return all;
}

}  // namespace deviascope
