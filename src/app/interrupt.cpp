// SPDX-License-Identifier: GPL-2.0-or-later
#include "app/interrupt.h"

#include <csignal>

namespace deviascope {

namespace {

volatile std::sig_atomic_t requested = 0;

extern "C" void request_end(int signal) {
    requested = 1;
    std::signal(signal, SIG_DFL);
}

}  // namespace

void watch_for_interrupts() {
    std::signal(SIGINT, request_end);
    std::signal(SIGTERM, request_end);
    std::signal(SIGPIPE, SIG_IGN);
}

bool interrupt_requested() {
    return requested != 0;
}

}  // namespace deviascope
