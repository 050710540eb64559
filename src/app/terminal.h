// SPDX-License-Identifier: GPL-2.0-or-later
// APP: the only stage that prints
#pragma once

#include <chrono>
#include <mutex>
#include <string>

#include "deviascope/core/progress.h"

namespace deviascope {

/// What the program says: plain lines on standard output, progress and warnings on standard
/// error. Progress overwrites itself on a terminal (a few times a second), is one line a minute
/// elsewhere, and silent with --quiet. Threads: any.
class Terminal {
  public:
    explicit Terminal(bool quiet);
    ~Terminal();
    Terminal(const Terminal&) = delete;
    Terminal& operator=(const Terminal&) = delete;

    /// A line (or several) of what was done; nothing with --quiet.
    void say(const std::string& text);
    /// A warning; printed with --quiet too.
    void warn(const std::string& text);
    /// Why the program ends early, though nothing failed; printed with --quiet too.
    void note(const std::string& text);
    /// Where library stages report progress.
    Progress progress();

    /// Why standard output lost a text, as errno tells it; 0 where all has arrived so far.
    static int output_failure();

  private:
    void show(const std::string& line);
    void wipe();  ///< by who holds the mutex

    std::mutex one_at_a_time_;  ///< for all that is printed
    bool quiet_;
    bool is_terminal_;
    bool line_open_ = false;
    std::chrono::steady_clock::time_point last_;
};

}  // namespace deviascope
