// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/job/dispersion_file.h"

#include <fmt/format.h>

#include <algorithm>
#include <utility>

#include "job/toml_reader.h"

namespace deviascope {

namespace {

const std::string& survey_of(const Job& job, const BinPlace& place) {
    return job.surveys[place.survey].name;
}

const std::string& bin_of(const Job& job, const BinPlace& place) {
    return job.surveys[place.survey].bins[place.bin].name;
}

}  // namespace

Companion dispersion_file(const Job& job, const std::vector<MeasuredDispersion>& measured) {
    std::string text = "# Dispersions measured from the counts of this job\n";
    for (const MeasuredDispersion& one : measured)
        text += fmt::format(
            "\n[[bin]]\nsurvey = \"{}\"\nbin = \"{}\"\ndispersion = {}\nsd = {:.2g}\n",
            survey_of(job, one.place),
            bin_of(job, one.place),
            one.value,
            one.sd);
    return {dispersion_file_name, dispersion_file_name, std::move(text)};
}

void adopt_dispersion(Job& job, const Companion& file) {
    TomlDocument document(file.text, file.path);
    const TomlTable root = document.root();
    for (const TomlTable& table : root.tables("bin", required)) {
        const std::string survey = table.text("survey", required).value_or("");
        const std::string bin = table.text("bin", required).value_or("");
        const auto value = table.number("dispersion", above(0), required);
        table.number("sd", at_least(0));
        const auto place =
            std::ranges::find_if(job.measure_dispersion, [&](const BinPlace& one) {
                return survey_of(job, one) == survey && bin_of(job, one) == bin;
            });
        if (place == job.measure_dispersion.end())
            table.fault_here(fmt::format("{}/{}", survey, bin),
                             "bins whose dispersion is \"measure\" are allowed");
        else if (value)
            job.model.surveys[place->survey].bins[place->bin].dispersion = *value;
    }
    document.finish();
    std::erase_if(job.companions, [&](const Companion& c) { return c.name == file.name; });
    job.companions.push_back(file);
}

}  // namespace deviascope
