// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <filesystem>
#include <string>
#include <vector>

#include "run_process.h"

namespace deviascope::test {

struct PythonResult {
    int exit_code = -1;  ///< 128 + signal where the script was ended by one
    std::string output;  ///< standard output, then standard error
};

/// Runs a script with /usr/bin/python3 (the interpreter that has numpy, scipy, healpy, astropy)
/// and waits for it. Arguments are passed as they are, through no shell.
inline PythonResult run_python(const std::filesystem::path& script,
                               const std::vector<std::string>& arguments = {}) {
    std::vector<std::string> words{"/usr/bin/python3", script.string()};
    words.insert(words.end(), arguments.begin(), arguments.end());
    const ProcessResult result = run_process(words);
    return {result.exit_code, result.out + result.err};
}

}  // namespace deviascope::test
