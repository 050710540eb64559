// SPDX-License-Identifier: GPL-2.0-or-later
#include "app/output_folder.h"

#include <fmt/format.h>

#include <cerrno>
#include <cstring>
#include <fstream>
#include <system_error>

#include "deviascope/core/error.h"

namespace deviascope {

namespace fs = std::filesystem;

namespace {

void make_folder(const fs::path& folder) {
    std::error_code failure;
    fs::create_directories(folder, failure);
    if (fs::is_directory(folder)) return;
    const std::string reason = failure ? failure.message() : "a file of that name is there";
    throw OutputError({folder.string(),
                       fmt::format("the folder cannot be made ({})", reason),
                       "a folder that can be made or written to",
                       "name another one with -o"});
}

}  // namespace

void prepare_output(const fs::path& folder,
                    const std::vector<std::string>& files,
                    bool replace) {
    make_folder(folder);
    std::string existing;
    for (const std::string& file : files) {
        if (!fs::exists(folder / file)) continue;
        if (replace) {
            fs::remove(folder / file);
        } else {
            existing += (existing.empty() ? "" : ", ") + file;
        }
    }
    if (existing.empty()) return;
    throw OutputError({folder.string(),
                       fmt::format("already holds {}", existing),
                       "nothing that exists is overwritten unasked",
                       "give --replace, or another folder with -o"});
}

void write_text(const fs::path& path, const std::string& text) {
    const fs::path temporary = path.string() + ".tmp";
    std::ofstream file(temporary, std::ios::binary);
    file << text;
    file.close();
    const int reason = errno;
    std::error_code failure;
    if (file) fs::rename(temporary, path, failure);
    if (file && !failure) return;
    fs::remove(temporary, failure);
    throw OutputError({path.string(),
                       fmt::format("cannot be written ({})", std::strerror(reason)),
                       "a writable folder with room",
                       ""});
}

}  // namespace deviascope
