// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <fcntl.h>
#include <sys/wait.h>
#include <unistd.h>

#include <csignal>
#include <fstream>
#include <iterator>
#include <stdexcept>
#include <string>
#include <vector>

#include "temporary_folder.h"

namespace deviascope::test {

struct ProcessResult {
    int exit_code = -1;  ///< 128 + signal where one ended it
    std::string out, err;
};

/// A program that runs beside the test, with no standard input; arguments go through no shell.
class Process {
  public:
    explicit Process(std::vector<std::string> words) {
        std::vector<char*> argv;
        for (std::string& word : words) argv.push_back(word.data());
        argv.push_back(nullptr);
        const std::string out = (folder_ / "out").string();
        const std::string err = (folder_ / "err").string();
        child_ = fork();
        if (child_ < 0) throw std::runtime_error("cannot start a process");
        if (child_ != 0) return;
        constexpr int flags = O_WRONLY | O_CREAT;
        dup2(open("/dev/null", O_RDONLY), STDIN_FILENO);
        dup2(open(out.c_str(), flags, 0600), STDOUT_FILENO);
        dup2(open(err.c_str(), flags, 0600), STDERR_FILENO);
        execv(argv[0], argv.data());
        _exit(127);
    }

    void send(int signal) const { kill(child_, signal); }

    ProcessResult wait() {
        int status = 0;
        waitpid(child_, &status, 0);
        return {WIFEXITED(status) ? WEXITSTATUS(status) : 128 + WTERMSIG(status),
                text_of("out"),
                text_of("err")};
    }

  private:
    std::string text_of(const char* name) const {
        std::ifstream file(folder_ / name, std::ios::binary);
        return {std::istreambuf_iterator<char>(file), std::istreambuf_iterator<char>()};
    }

    TemporaryFolder folder_;
    pid_t child_ = -1;
};

inline ProcessResult run_process(const std::vector<std::string>& words) {
    return Process(words).wait();
}

}  // namespace deviascope::test
