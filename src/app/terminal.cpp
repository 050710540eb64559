// SPDX-License-Identifier: GPL-2.0-or-later
#include "app/terminal.h"

#include <unistd.h>

#include <cerrno>
#include <cstdio>

namespace deviascope {

namespace {
using std::chrono::milliseconds;
constexpr milliseconds between_lines_on_terminal{200};
constexpr milliseconds between_lines_elsewhere{60000};
}  // namespace

Terminal::Terminal(bool quiet)
    : quiet_(quiet),
      is_terminal_(isatty(STDERR_FILENO) == 1),
      last_(std::chrono::steady_clock::now()) {}

Terminal::~Terminal() {
    wipe();
}

void Terminal::say(const std::string& text) {
    if (quiet_) return;
    const std::lock_guard lock(one_at_a_time_);
    wipe();
    std::fprintf(stdout, "%s\n", text.c_str());
    output_failure();
}

int Terminal::output_failure() {
    static int first = 0;
    errno = 0;
    const bool lost = std::fflush(stdout) != 0 || std::ferror(stdout) != 0;
    if (lost && first == 0) first = errno != 0 ? errno : EIO;
    return first;
}

void Terminal::warn(const std::string& text) {
    const std::lock_guard lock(one_at_a_time_);
    wipe();
    std::fprintf(stderr, "Warning: %s\n", text.c_str());
}

void Terminal::note(const std::string& text) {
    const std::lock_guard lock(one_at_a_time_);
    wipe();
    std::fprintf(stderr, "deviascope: %s\n", text.c_str());
}

Progress Terminal::progress() {
    if (quiet_) return {};
    return [this](const std::string& line) { show(line); };
}

void Terminal::show(const std::string& line) {
    const std::lock_guard lock(one_at_a_time_);
    const auto now = std::chrono::steady_clock::now();
    if (now - last_ < (is_terminal_ ? between_lines_on_terminal : between_lines_elsewhere))
        return;
    last_ = now;
    if (is_terminal_) {
        std::fprintf(stderr, "\r%s\x1b[K", line.c_str());
        line_open_ = true;
    } else {
        std::fprintf(stderr, "%s\n", line.c_str());
    }
    std::fflush(stderr);
}

void Terminal::wipe() {
    if (!line_open_) return;
    std::fprintf(stderr, "\r\x1b[K");
    std::fflush(stderr);
    line_open_ = false;
}

}  // namespace deviascope
