// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <sys/wait.h>
#include <unistd.h>

#include <array>
#include <filesystem>
#include <stdexcept>
#include <string>
#include <vector>

namespace deviascope::test {

struct PythonResult {
    int exit_code = -1;  ///< 128 + signal where the script was ended by one
    std::string output;  ///< standard output and standard error, in the order written
};

/// Runs a script with /usr/bin/python3 (the interpreter that has numpy, scipy, healpy, astropy)
/// and waits for it. Arguments are passed as they are, through no shell.
inline PythonResult run_python(const std::filesystem::path& script,
                               const std::vector<std::string>& arguments = {}) {
    std::vector<std::string> words{"/usr/bin/python3", script.string()};
    words.insert(words.end(), arguments.begin(), arguments.end());
    std::vector<char*> argv;
    for (std::string& word : words) argv.push_back(word.data());
    argv.push_back(nullptr);

    std::array<int, 2> pipe_ends{};
    if (pipe(pipe_ends.data()) != 0) throw std::runtime_error("cannot make a pipe");
    const pid_t child = fork();
    if (child < 0) throw std::runtime_error("cannot start a process");
    if (child == 0) {
        dup2(pipe_ends[1], STDOUT_FILENO);
        dup2(pipe_ends[1], STDERR_FILENO);
        close(pipe_ends[0]);
        close(pipe_ends[1]);
        execv(argv[0], argv.data());
        _exit(127);
    }
    close(pipe_ends[1]);
    PythonResult result;
    std::array<char, 4096> buffer{};
    ssize_t n = 0;
    while ((n = read(pipe_ends[0], buffer.data(), buffer.size())) > 0)
        result.output.append(buffer.data(), static_cast<std::size_t>(n));
    close(pipe_ends[0]);
    int status = 0;
    waitpid(child, &status, 0);
    result.exit_code = WIFEXITED(status) ? WEXITSTATUS(status) : 128 + WTERMSIG(status);
    return result;
}

}  // namespace deviascope::test
