// SPDX-License-Identifier: GPL-2.0-or-later
#include <fmt/format.h>

#include <algorithm>
#include <system_error>

#include "deviascope/core/digest.h"
#include "deviascope/core/error.h"
#include "deviascope/core/version.h"
#include "deviascope/job/job.h"

namespace deviascope {

namespace {

/// Writes down what decides the counts, one field after another, in one spelling. Texts carry
/// their length, so that no two jobs read alike.
class Canonical {
  public:
    Canonical(const Job& job, const std::vector<InputDigest>& digests)
        : inputs_(job.inputs), digests_(digests) {}

    void add(const std::string& text) { text_ += fmt::format("{}:{}\n", text.size(), text); }
    void add(const char* text) { add(std::string(text)); }
    void add(double value) { add(fmt::format("{}", value)); }  // shortest that reads back
    void add(Frame frame) { add(name_of(frame)); }
    void add(const PropertyRange& range) {
        add(range.property);
        add(range.low);
        add(range.high);
    }
    void add(const Exclusion& exclusion);
    /// A file counts by its bytes, not by its name.
    void add(const std::filesystem::path& path);

    template <class Value>
    void add(const std::optional<Value>& value) {
        value ? add(*value) : add("absent");
    }
    template <class Value>
    void add(const std::vector<Value>& values) {
        add(static_cast<double>(values.size()));
        for (const Value& value : values) add(value);
    }

    void add(const BinInput& bin) {
        add(bin.name);
        add(bin.select);
        add(bin.counts);
        add(bin.exposure);
    }
    void add(const SurveyInput& survey);
    void add(const SurveyWeighing& weighing);

    std::string digest() const { return digest_of(text_); }

  private:
    const std::vector<InputFile>& inputs_;
    const std::vector<InputDigest>& digests_;
    std::string text_;
};

void Canonical::add(const std::filesystem::path& path) {
    const auto found = std::find_if(
        inputs_.begin(), inputs_.end(), [&](const InputFile& i) { return i.path == path; });
    ensure(found != inputs_.end(), "every data file of a job is among its inputs");
    add(digests_[static_cast<std::size_t>(found - inputs_.begin())].sha256);
}

void Canonical::add(const Exclusion& exclusion) {
    add(exclusion.frame);
    const auto& region = exclusion.region;
    if (const auto* band = std::get_if<BandExclusion>(&region)) {
        add("band");
        add(band->half_width_deg);
    } else if (const auto* disc = std::get_if<DiscExclusion>(&region)) {
        add("disc");
        for (const double value : {disc->lon_deg, disc->lat_deg, disc->radius_deg}) add(value);
    } else if (const auto* below = std::get_if<BelowExclusion>(&region)) {
        add("below");
        add(below->lat_deg);
    } else {
        add("above");
        add(std::get<AboveExclusion>(region).lat_deg);
    }
}

void Canonical::add(const SurveyInput& survey) {
    add(survey.name);
    add(survey.catalogue);
    add(survey.table);
    add(survey.frame);
    add(static_cast<double>(survey.columns.size()));
    for (const auto& [property, column] : survey.columns) {
        add(property);
        add(column);
    }
    add(survey.exposure);
    add(survey.map_frame);
    add(survey.exclude);
    add(survey.select);
    add(survey.bad_rows == BadRows::skip ? "skip" : "stop");
    add(survey.bins);
}

void Canonical::add(const SurveyWeighing& weighing) {
    add(weighing.physics.alpha ? weighing.physics.alpha->mean : 0.0);
    add(weighing.physics.alpha ? weighing.physics.alpha->sd : -1.0);
    add(static_cast<double>(weighing.physics.scatter.size()));
    for (const auto& [property, error] : weighing.physics.scatter) {
        add(property);
        add(error.amount);
        add(error.times_one_plus_z ? "times 1+z" : "as it is");
    }
    add(static_cast<double>(weighing.bins.size()));
    for (const std::size_t bin : weighing.bins) add(static_cast<double>(bin));
}

}  // namespace

std::string digest_of_inputs(const Job& job, const std::vector<InputDigest>& inputs) {
    ensure(inputs.size() == job.inputs.size(), "there is one digest for each input of the job");
    Canonical text(job, inputs);
    text.add("deviascope counts, schema 1");
    text.add(static_cast<double>(job.nside));
    text.add(job.frame);
    text.add(job.surveys);
    for (const Deduplication& one : job.deduplicate) {
        text.add(job.surveys[one.first].name);
        text.add(job.surveys[one.second].name);
        text.add(job.match_arcsec);
    }
    return text.digest();
}

std::string digest_of_weighing(const Job& job,
                               std::size_t survey,
                               const std::vector<InputDigest>& inputs) {
    ensure(inputs.size() == job.inputs.size(), "there is one digest for each input of the job");
    const SurveyWeighing& weighing = job.weighing[survey];
    Canonical text(job, inputs);
    text.add("deviascope weights, " + version());
    text.add(std::to_string(job.seed));
    text.add(static_cast<double>(survey));
    text.add(static_cast<double>(job.nside));
    text.add(job.frame);
    text.add(job.surveys[survey]);
    text.add(weighing);
    return text.digest();
}

std::vector<InputDigest> digests_of_inputs(const Job& job, const Progress& progress) {
    std::vector<InputDigest> digests;
    for (const InputFile& input : job.inputs) {
        std::error_code failure;
        const auto bytes = std::filesystem::file_size(input.path, failure);
        digests.push_back({input.written,
                           digest_of_file(input.path, progress),
                           failure ? 0 : static_cast<std::int64_t>(bytes)});
    }
    return digests;
}

}  // namespace deviascope
