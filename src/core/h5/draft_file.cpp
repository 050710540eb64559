// SPDX-License-Identifier: GPL-2.0-or-later
#include "core/h5/draft_file.h"

#include <algorithm>
#include <cstring>
#include <exception>
#include <utility>

namespace deviascope::h5 {

void Draft::write_to(const Descriptor& file) const {
    pages.write_to(file, length);
    // The end of the file may be a hole or lie before what was there.
    if (file.size() != length) file.resize(length);
}

struct DraftFile::Parts {
    const Descriptor* base = nullptr;
    Draft draft;
    bool is_open = false;
    std::exception_ptr fault;  ///< the first that the library could not be told of

    Parts(const Descriptor* the_base, Pages room) : base(the_base) {
        draft.pages = std::move(room);
        draft.pages.clear();
        if (base != nullptr) draft.length = base->size();
    }

    void read(std::uint64_t offset, char* to, std::size_t n_bytes) const {
        on_pages(offset, n_bytes, [&](std::uint64_t number, std::size_t start, std::size_t n) {
            if (const char* changed = draft.pages.find(number)) {
                std::memcpy(to, changed + start, n);
            } else {
                read_base(number * page_bytes + start, {to, n});
            }
            to += n;
        });
    }

    void write(std::uint64_t offset, const char* from, std::size_t n_bytes) {
        if (!take_over(offset, from, n_bytes)) copy(offset, from, n_bytes);
        draft.length = std::max(draft.length, offset + n_bytes);
    }

  private:
    /// Makes bytes that lie in reserved memory pages as they are, if they can be.
    bool take_over(std::uint64_t offset, const char* from, std::size_t n_bytes) {
        const std::size_t n_pages = pages_for(n_bytes);
        if (offset % page_bytes != 0 || !draft.pages.adopt(from, offset / page_bytes, n_pages))
            return false;
        char* const memory = draft.pages.find(offset / page_bytes);
        read_base(offset + n_bytes, {memory + n_bytes, n_pages * page_bytes - n_bytes});
        return true;
    }

    void copy(std::uint64_t offset, const char* from, std::size_t n_bytes) {
        on_pages(offset, n_bytes, [&](std::uint64_t number, std::size_t start, std::size_t n) {
            char* page = draft.pages.find(number);
            if (page == nullptr) {
                page = draft.pages.add(number);
                if (n < page_bytes) read_base(number * page_bytes, {page, page_bytes});
            }
            std::memcpy(page + start, from, n);
            from += n;
        });
    }

    /// Bytes beyond the end of the base are zero.
    void read_base(std::uint64_t offset, std::span<char> to) const {
        const std::size_t n_read = base == nullptr ? 0 : base->read(to, offset);
        std::fill(to.begin() + static_cast<std::ptrdiff_t>(n_read), to.end(), '\0');
    }

    /// Calls with (page, first byte in it, bytes of it) for each page of a range.
    template <class Call>
    static void on_pages(std::uint64_t offset, std::size_t n_bytes, Call&& call) {
        while (n_bytes > 0) {
            const std::uint64_t start = offset % page_bytes;
            const std::size_t n = std::min<std::size_t>(n_bytes, page_bytes - start);
            call(offset / page_bytes, start, n);
            offset += n;
            n_bytes -= n;
        }
    }
};

namespace {

/// The library asks the system for the name, and must not find a file.
constexpr const char* unused_name = "/dev/null/deviascope-draft";

/// What is smaller would leave holes of some size.
constexpr hsize_t fewest_aligned_bytes = hsize_t{16} * page_bytes;

// ---- the driver: what the library calls (HDF5 Virtual File Layer) ----

struct DriverInfo {
    DraftFile::Parts* parts;
};

/// A file as the library holds it; its own part comes first.
struct DriverFile {
    H5FD_t own{};
    DraftFile::Parts* parts = nullptr;
    haddr_t end_of_space = 0;
};

DriverFile* of(H5FD_t* file) {
    return reinterpret_cast<DriverFile*>(file);
}
const DriverFile* of(const H5FD_t* file) {
    return reinterpret_cast<const DriverFile*>(file);
}

H5FD_t* open_draft(const char*, unsigned, hid_t access, haddr_t) {
    const auto* info = static_cast<const DriverInfo*>(H5Pget_driver_info(access));
    auto* file = new (std::nothrow) DriverFile;
    if (info == nullptr || file == nullptr) return nullptr;
    file->parts = info->parts;
    file->parts->is_open = true;
    return &file->own;
}

herr_t close_draft(H5FD_t* file) {
    of(file)->parts->is_open = false;
    delete of(file);
    return 0;
}

herr_t say_features(const H5FD_t*, unsigned long* features) {
    *features = H5FD_FEAT_AGGREGATE_METADATA | H5FD_FEAT_ACCUMULATE_METADATA |
                H5FD_FEAT_DATA_SIEVE | H5FD_FEAT_AGGREGATE_SMALLDATA;
    return 0;
}

/// Never lets an exception into the library. Its books are in order as long as no write fails;
/// so a failure is only noted, and told when the file is closed.
template <class Call>
herr_t noting_faults(DraftFile::Parts& parts, herr_t on_fault, Call&& call) {
    try {
        call();
        return 0;
    } catch (...) {
        if (!parts.fault) parts.fault = std::current_exception();
        return on_fault;
    }
}

herr_t read_draft(
    H5FD_t* file, H5FD_mem_t, hid_t, haddr_t offset, size_t n_bytes, void* buffer) {
    DraftFile::Parts& parts = *of(file)->parts;
    return noting_faults(
        parts, -1, [&] { parts.read(offset, static_cast<char*>(buffer), n_bytes); });
}

herr_t write_draft(
    H5FD_t* file, H5FD_mem_t, hid_t, haddr_t offset, size_t n_bytes, const void* buffer) {
    DraftFile::Parts& parts = *of(file)->parts;
    return noting_faults(
        parts, 0, [&] { parts.write(offset, static_cast<const char*>(buffer), n_bytes); });
}

H5FD_class_t draft_driver() {
    H5FD_class_t driver{};
    driver.name = "deviascope-draft";
    driver.maxaddr = HADDR_MAX;
    driver.fc_degree = H5F_CLOSE_WEAK;
    driver.fapl_size = sizeof(DriverInfo);
    driver.open = open_draft;
    driver.close = close_draft;
    driver.query = say_features;
    driver.get_eoa = [](const H5FD_t* file, H5FD_mem_t) { return of(file)->end_of_space; };
    driver.set_eoa = [](H5FD_t* file, H5FD_mem_t, haddr_t end) -> herr_t {
        of(file)->end_of_space = end;
        return 0;
    };
    driver.get_eof = [](const H5FD_t* file, H5FD_mem_t) -> haddr_t {
        return of(file)->parts->draft.length;
    };
    driver.read = read_draft;
    driver.write = write_draft;
    driver.truncate = [](H5FD_t* file, hid_t, hbool_t) -> herr_t {
        of(file)->parts->draft.length = of(file)->end_of_space;
        return 0;
    };
    constexpr H5FD_mem_t by_kind[H5FD_MEM_NTYPES] = H5FD_FLMAP_DICHOTOMY;
    std::copy(std::begin(by_kind), std::end(by_kind), std::begin(driver.fl_map));
    return driver;
}

hid_t draft_driver_id() {
    static const H5FD_class_t driver = draft_driver();
    static const hid_t id = checked(H5FDregister(&driver), "H5FDregister");
    return id;
}

H5::FileAccPropList access_to(DraftFile::Parts* parts) {
    H5::FileAccPropList access;
    access.setLibverBounds(H5F_LIBVER_V110, H5F_LIBVER_V110);
    // An object that an error has left open must not keep the file open.
    access.setFcloseDegree(H5F_CLOSE_STRONG);
    const DriverInfo info{parts};
    checked(H5Pset_driver(access.getId(), draft_driver_id(), &info), "H5Pset_driver");
    // Chunks that are large begin at a page, so that they can be taken over.
    checked(H5Pset_alignment(access.getId(), fewest_aligned_bytes, page_bytes),
            "H5Pset_alignment");
    return access;
}

H5::FileCreatPropList creation_without_times() {
    H5::FileCreatPropList list;
    checked(H5Pset_obj_track_times(list.getId(), false), "H5Pset_obj_track_times");
    return list;
}

}  // namespace

DraftFile::DraftFile(const Descriptor* base, Pages room)
    : parts_(std::make_unique<Parts>(base, std::move(room))),
      file_(unused_name,
            base == nullptr ? H5F_ACC_TRUNC : H5F_ACC_RDWR,
            creation_without_times(),
            access_to(parts_.get())) {}

DraftFile::~DraftFile() {
    try {
        file_.close();
    } catch (const H5::Exception&) {
        // Whoever wanted the content has taken it.
    }
}

char* DraftFile::room_for(std::size_t n_bytes) {
    return parts_->draft.pages.reserve(pages_for(n_bytes));
}

Draft DraftFile::close() {
    file_.close();
    if (parts_->fault) std::rethrow_exception(parts_->fault);
    if (parts_->is_open) throw H5::Exception("close", "an object of the file is still open");
    return std::move(parts_->draft);
}

}  // namespace deviascope::h5
