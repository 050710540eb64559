// SPDX-License-Identifier: GPL-2.0-or-later
// A program of somebody else's: reads a job with the installed library and says what is in it.
#include <cstdio>

#include "deviascope/core/error.h"
#include "deviascope/job/job.h"

int main(int, char** argv) {
    try {
        const deviascope::Job job = deviascope::read_job(argv[1]);
        std::printf("%s: %zu survey(s), nside %d\n", job.title.c_str(), job.surveys.size(), job.nside);
        return 0;
    } catch (const deviascope::Error& error) {
        std::printf("%s\n", error.what());
        return static_cast<int>(error.exit_code());
    }
}
