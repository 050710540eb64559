// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/mock/write_mock.h"

#include <utility>

#include "deviascope/core/error.h"
#include "deviascope/mock/exposure.h"
#include "deviascope/sky/healpix_map.h"
#include "mock/catalogue_writer.h"

namespace deviascope {

namespace {

void make_folder(const std::filesystem::path& folder) {
    std::error_code error;
    std::filesystem::create_directories(folder, error);
    if (!error) return;
    throw OutputError({folder.string(),
                       "cannot be made (" + error.message() + ")",
                       "a folder that can be written is needed",
                       ""});
}

void refuse_existing(const Scenario& scenario, const std::filesystem::path& folder) {
    std::vector<std::string> names = {"truth.toml"};
    for (const MockSurvey& survey : scenario.surveys) {
        names.push_back(survey.catalogue_file());
        if (!survey.exposure_file().empty()) names.push_back(survey.exposure_file());
    }
    for (const std::string& name : names)
        if (std::filesystem::exists(folder / name))
            throw OutputError({(folder / name).string(),
                               "exists",
                               "nothing is overwritten unless asked",
                               "give --replace or another folder"});
}

/// An old truth must not stand beside new catalogues, even if this run is killed.
void remove_old_truth(const std::filesystem::path& folder) {
    std::error_code error;
    std::filesystem::remove(folder / "truth.toml", error);
    if (!error) return;
    throw OutputError({(folder / "truth.toml").string(),
                       "cannot be removed (" + error.message() + ")",
                       "a folder that can be written is needed",
                       ""});
}

void write_exposure(const MockSurvey& survey,
                    const std::filesystem::path& folder,
                    MockReport& report) {
    if (survey.exposure_file().empty()) return;
    report.files.push_back(folder / survey.exposure_file());
    write_healpix_map(report.files.back(), exposure_map(*survey.exposure), "EXPOSURE");
}

/// False where it was stopped; the unfinished file is gone then.
bool write_survey(const Scenario& scenario,
                  std::size_t survey,
                  const std::filesystem::path& path,
                  const MockOptions& options,
                  MockReport& report) {
    const auto catalogue = open_catalogue(path, scenario, scenario.surveys[survey]);
    report.tally.push_back(draw_survey(
        scenario, survey, options, [&](const MockRows& rows) { catalogue->write(rows); }));
    if (!report.tally.back().finished) return false;
    catalogue->close();
    report.files.push_back(path);
    return true;
}

}  // namespace

MockReport write_mock(const Scenario& scenario,
                      const std::filesystem::path& folder,
                      const MockOptions& options,
                      bool replace) {
    if (std::vector<Message> problems = scenario.problems(); !problems.empty())
        throw UsageError(std::move(problems));
    make_folder(folder);
    if (!replace) refuse_existing(scenario, folder);
    remove_old_truth(folder);
    MockReport report;
    report.warnings = scenario.warnings();
    for (std::size_t survey = 0; survey < scenario.surveys.size(); ++survey) {
        const std::filesystem::path path = folder / scenario.surveys[survey].catalogue_file();
        if (!write_survey(scenario, survey, path, options, report)) {
            report.finished = false;
            return report;
        }
        write_exposure(scenario.surveys[survey], folder, report);
    }
    report.files.push_back(folder / "truth.toml");
    write_text_file(report.files.back(), truth_text(scenario, report.tally));
    return report;
}

}  // namespace deviascope
