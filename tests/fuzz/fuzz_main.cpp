// SPDX-License-Identifier: GPL-2.0-or-later
// One libFuzzer program for all targets: DEVIASCOPE_FUZZ_TARGET in the environment names one.
#include <cstdlib>
#include <cstring>

#include "targets.h"

namespace {

const deviascope::fuzz::Target* chosen() {
    const char* name = std::getenv("DEVIASCOPE_FUZZ_TARGET");
    for (const auto& target : deviascope::fuzz::targets())
        if (name != nullptr && std::strcmp(name, target.name) == 0) return &target;
    std::abort();
}

}  // namespace

extern "C" int LLVMFuzzerTestOneInput(const std::uint8_t* data, std::size_t size) {
    static const deviascope::fuzz::Target* const target = chosen();
    target->run({data, size});
    return 0;
}
