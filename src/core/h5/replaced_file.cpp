// SPDX-License-Identifier: GPL-2.0-or-later
#include "core/h5/replaced_file.h"

#include <fcntl.h>
#include <unistd.h>

#include <cerrno>
#include <system_error>

namespace deviascope::h5 {

namespace fs = std::filesystem;

namespace {

OutputError failure(const fs::path& path, const std::error_code& reason) {
    return OutputError({path.string(), "cannot be written: " + reason.message(), "", ""});
}

fs::path beside(const fs::path& path, const char* suffix) {
    fs::path name = path;
    name += suffix;
    return name;
}

void rename_durably(const fs::path& from, const fs::path& to) {
    std::error_code failed;
    fs::rename(from, to, failed);
    if (failed) throw failure(to, failed);
    const fs::path folder = to.parent_path();
    put_on_disk(folder.empty() ? fs::path(".") : folder);
}

void replace(const fs::path& path,
             const fs::path& beside_it,
             Writer::Mode mode,
             const Edit& edit) {
    try {
        Writer writer(beside_it, mode);
        edit(writer);
        writer.close();
        rename_durably(beside_it, path);
    } catch (...) {
        std::error_code ignored;  // the first error is the one to tell
        fs::remove(beside_it, ignored);
        throw;
    }
}

}  // namespace

void put_on_disk(const fs::path& path) {
    const int descriptor = ::open(path.c_str(), O_RDONLY | O_CLOEXEC);
    if (descriptor < 0) throw failure(path, {errno, std::generic_category()});
    const int status = ::fsync(descriptor);
    const int reason = errno;
    ::close(descriptor);
    if (status != 0) throw failure(path, {reason, std::generic_category()});
}

void write_file(const fs::path& path, const Edit& fill) {
    std::error_code ignored;
    if (fs::is_directory(path, ignored))
        throw failure(path, std::make_error_code(std::errc::is_a_directory));
    replace(path, beside(path, ".tmp"), Writer::Mode::create, fill);
}

void change_file(const fs::path& path, const Edit& change) {
    const fs::path next = beside(path, ".next");
    std::error_code failed;
    fs::copy_file(path, next, fs::copy_options::overwrite_existing, failed);
    if (failed) {
        std::error_code ignored;
        fs::remove(next, ignored);
        throw failure(path, failed);
    }
    replace(path, next, Writer::Mode::change, change);
}

}  // namespace deviascope::h5
