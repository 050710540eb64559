// SPDX-License-Identifier: GPL-2.0-or-later
// APP: on top of all stages
#pragma once

namespace deviascope {

/// From now on Ctrl-C (SIGINT) and SIGTERM ask for a clean end; a second one ends at once. A
/// closed pipe on standard output no longer kills the program.
void watch_for_interrupts();

/// Thrown by a step before sampling where a clean end was asked for; nothing is left half made.
struct Interrupted {};

/// Whether a clean end was asked for.
bool interrupt_requested();

}  // namespace deviascope
