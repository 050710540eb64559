// SPDX-License-Identifier: GPL-2.0-or-later
#include "targets.h"

#include <fmt/format.h>
#include <sys/mman.h>
#include <unistd.h>

#include <filesystem>
#include <stdexcept>

#include "deviascope/catalogue/table.h"
#include "deviascope/chain/chain_file.h"
#include "deviascope/core/error.h"
#include "deviascope/counts/counts_file.h"
#include "deviascope/job/job.h"
#include "deviascope/sky/healpix_map.h"
#include "deviascope/sky/moc.h"

namespace deviascope::fuzz {

namespace {

/// Bytes as a file in memory.
class MemoryFile {
  public:
    explicit MemoryFile(Bytes bytes) : descriptor_(memfd_create("fuzz", MFD_CLOEXEC)) {
        const auto n = static_cast<ssize_t>(bytes.size());
        if (descriptor_ < 0 || write(descriptor_, bytes.data(), bytes.size()) != n)
            throw std::runtime_error("no file in memory can be made");
    }
    ~MemoryFile() { close(descriptor_); }
    MemoryFile(const MemoryFile&) = delete;
    MemoryFile& operator=(const MemoryFile&) = delete;
    std::filesystem::path path() const { return fmt::format("/proc/self/fd/{}", descriptor_); }

  private:
    int descriptor_;
};

/// Runs a reader; only faults of the input may stop it.
template <class Reader>
void read(Reader reader) {
    try {
        reader();
    } catch (const InternalError&) {
        throw;
    } catch (const Error&) {
        // Refused, as it should be.
    }
}

void job(Bytes bytes) {
    const std::string text(bytes.begin(), bytes.end());
    const auto companions = [](const std::string& name) -> std::optional<Companion> {
        if (name == "free-velocity")
            return Companion{name, name, "kind = \"uniform-vector\"\nmax = 0.05\n"};
        return std::nullopt;
    };
    read([&] { parse_job(text, "job.toml", companions); });
}

/// Any catalogue: the columns `ra` and `dec`, in whichever form the bytes are.
void table(Bytes bytes) {
    const MemoryFile file(bytes);
    read([&] {
        const auto reader = open_table(file.path(), {}, {"ra", "dec"});
        TableChunk chunk;
        std::int64_t rows = 0;
        while (rows < 1000000 && reader->next(chunk)) rows += chunk.n_rows();
        if (rows > 0) reader->place_of_row(rows - 1);
    });
}

void healpix_map(Bytes bytes) {
    const MemoryFile file(bytes);
    read([&] { read_healpix_map(file.path()); });
}

void moc(Bytes bytes) {
    const MemoryFile file(bytes);
    read([&] {
        const Moc region = read_moc(file.path()).region;
        region.contains(Direction::UnitX());
        region.share_of(5, 0);
        region.order();
    });
}

void counts(Bytes bytes) {
    const MemoryFile file(bytes);
    read([&] { read_counts(file.path()); });
}

void chain(Bytes bytes) {
    const MemoryFile file(bytes);
    read([&] { read_chain(file.path()); });
}

}  // namespace

const std::vector<Target>& targets() {
    static const std::vector<Target> all{{"job", job},
                                         {"csv", table},
                                         {"fits_table", table},
                                         {"hdf5_table", table},
                                         {"healpix_map", healpix_map},
                                         {"moc", moc},
                                         {"counts", counts},
                                         {"chain", chain}};
    return all;
}

}  // namespace deviascope::fuzz
