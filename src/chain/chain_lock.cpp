// SPDX-License-Identifier: GPL-2.0-or-later
#include <fcntl.h>

#include <system_error>

#include "core/descriptor.h"
#include "core/h5/exchanged_file.h"
#include "deviascope/chain/chain_file.h"

namespace deviascope {

namespace fs = std::filesystem;

namespace {

/// Opens and locks. A lock on a file that its former holder has removed in between would lock
/// nothing, hence the question whether it is still there.
Descriptor locked(const fs::path& path) {
    for (;;) {
        Descriptor file(path, O_RDWR | O_CREAT);
        if (!file.try_lock())
            throw OutputError({path.string(),
                               "another process is writing this chain",
                               "one process at a time may write it",
                               "wait for it to end, or choose another folder with -o"});
        if (file.is_at(path)) return file;
    }
}

}  // namespace

struct ChainLock::Parts {
    fs::path chain, path;
    Descriptor file;

    explicit Parts(const fs::path& the_chain) : chain(the_chain), path(the_chain) {
        path += ".lock";
        file = locked(path);
        h5::remove_leftovers(chain);
    }
    ~Parts() {
        std::error_code ignored;
        fs::remove(path, ignored);  // while it is still locked
    }
    Parts(const Parts&) = delete;
    Parts& operator=(const Parts&) = delete;
};

ChainLock::ChainLock(const fs::path& chain) : parts_(std::make_shared<const Parts>(chain)) {}

const fs::path& ChainLock::chain() const {
    return parts_->chain;
}

}  // namespace deviascope
