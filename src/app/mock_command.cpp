// SPDX-License-Identifier: GPL-2.0-or-later
#include <fmt/format.h>

#include "app/commands.h"
#include "app/interrupt.h"
#include "app/terminal.h"
#include "deviascope/core/grouped_number.h"
#include "deviascope/job/scenario_file.h"
#include "deviascope/mock/write_mock.h"

namespace deviascope {

ExitCode mock_command(const CommandOptions& options) {
    Terminal terminal(options.quiet);
    const Scenario scenario = read_scenario(options.input);
    MockOptions mock;
    mock.threads = options.n_threads();
    mock.stop_requested = interrupt_requested;
    mock.progress = terminal.progress();
    const std::filesystem::path folder =
        options.output.empty() ? options.input.stem() : options.output;
    const MockReport report = write_mock(scenario, folder, mock, options.replace);
    for (std::size_t survey = 0; survey < report.tally.size(); ++survey)
        terminal.say(fmt::format("{}: {} sources drawn over the full sky, {} rows kept.",
                                 scenario.surveys[survey].name,
                                 grouped(report.tally[survey].drawn),
                                 grouped(report.tally[survey].rows)));
    for (const std::string& warning : report.warnings) terminal.warn(warning);
    for (const auto& file : report.files)
        terminal.say(fmt::format("Written: {}", file.string()));
    return report.finished ? ExitCode::done : ExitCode::interrupted;
}

}  // namespace deviascope
