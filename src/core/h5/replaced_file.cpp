// SPDX-License-Identifier: GPL-2.0-or-later
#include "core/h5/replaced_file.h"

#include <fcntl.h>
#include <stdio.h>

#include <system_error>

#include "core/h5/draft_file.h"

namespace deviascope::h5 {

namespace fs = std::filesystem;

namespace {

void write_durably(const fs::path& path, const Draft& draft) {
    Descriptor file(path, O_WRONLY | O_CREAT | O_TRUNC);
    draft.write_to(file);
    file.sync();
    file.close();
}

}  // namespace

void write_file(const fs::path& path, const Edit& fill) {
    Writer writer(path);
    fill(writer);
    const Draft draft = writer.close();
    fs::path temporary = path;
    temporary += ".tmp";
    try {
        write_durably(temporary, draft);
        if (::rename(temporary.c_str(), path.c_str()) != 0)
            throw system_error(path, "cannot be replaced");
        sync_folder_of(path);
    } catch (...) {
        std::error_code ignored;  // the first error is the one to tell
        fs::remove(temporary, ignored);
        throw;
    }
}

void change_file(const fs::path& path, const Edit& change) {
    ExchangedFile(path).change(change);
}

}  // namespace deviascope::h5
