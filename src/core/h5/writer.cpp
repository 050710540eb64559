// SPDX-License-Identifier: GPL-2.0-or-later
#include "core/h5/writer.h"

#include <algorithm>
#include <limits>
#include <utility>

#include "core/h5/draft_file.h"
#include "core/h5/whole_chunks.h"

namespace deviascope::h5 {

/// Values in memory and how they are stored.
struct Writer::Elements {
    const void* data = nullptr;
    std::size_t count = 0;
    H5::DataType in_memory, in_file;

    explicit Elements(std::span<const double> values)
        : data(values.data()),
          count(values.size()),
          in_memory(H5::PredType::NATIVE_DOUBLE),
          in_file(H5::PredType::IEEE_F64LE) {}
    explicit Elements(std::span<const std::int64_t> values)
        : data(values.data()),
          count(values.size()),
          in_memory(H5::PredType::NATIVE_INT64),
          in_file(H5::PredType::STD_I64LE) {}
    explicit Elements(std::span<const std::uint32_t> values)
        : data(values.data()),
          count(values.size()),
          in_memory(H5::PredType::NATIVE_UINT32),
          in_file(H5::PredType::STD_U32LE) {}
    /// Texts padded to `n_bytes` each.
    Elements(const std::string& padded, std::size_t n_bytes)
        : data(padded.data()),
          count(padded.size() / n_bytes),
          in_memory(text_type(n_bytes)),
          in_file(text_type(n_bytes)) {}
};

struct Writer::Layout {
    H5::DataType type;
    Shape shape;
    Shape chunk;
    bool grows = false;
    Packing packing = Packing::deflated;
};

struct Writer::Parts {
    std::unique_ptr<DraftFile> draft;
    H5::H5File& file() { return draft->file(); }
};

namespace {

constexpr std::size_t default_chunk = 65536;  // elements; half a megabyte of doubles
constexpr int deflate_level = 1;

template <class PropertyList>
PropertyList without_times(PropertyList list) {
    checked(H5Pset_obj_track_times(list.getId(), false), "H5Pset_obj_track_times");
    return list;
}

/// Chunks of about `default_chunk` elements: whole entries of the first axis, or parts of a
/// list.
Shape chunk_for(const Shape& shape) {
    Shape chunk = shape;
    const std::size_t per_entry = std::max<std::size_t>(n_elements(shape) / shape[0], 1);
    chunk[0] = std::clamp<std::size_t>(default_chunk / per_entry, 1, shape[0]);
    return chunk;
}

/// Chunks may not exceed what can never grow.
Shape fitted(Shape chunk, const Shape& shape, bool grows) {
    for (std::size_t axis = grows ? 1 : 0; axis < shape.size(); ++axis)
        chunk[axis] = std::min(chunk[axis], shape[axis]);
    return chunk;
}

H5::DSetCreatPropList storage(const Shape& chunk, bool deflated) {
    auto list = without_times(H5::DSetCreatPropList());
    if (chunk.empty()) return list;
    list.setChunk(static_cast<int>(chunk.size()), extents(chunk).data());
    if (deflated) {
        list.setShuffle();
        list.setDeflate(deflate_level);
    }
    list.setFletcher32();
    return list;
}

H5::DataSpace space_of(const Shape& shape, bool grows) {
    std::vector<hsize_t> largest = extents(shape);
    if (grows) largest[0] = H5S_UNLIMITED;
    return H5::DataSpace(static_cast<int>(shape.size()), extents(shape).data(), largest.data());
}

std::size_t longest(const std::vector<std::string>& texts) {
    std::size_t n_bytes = 1;
    for (const std::string& text : texts) n_bytes = std::max(n_bytes, text.size());
    return n_bytes;
}

std::string padded(const std::vector<std::string>& texts, std::size_t n_bytes) {
    std::string all;
    all.reserve(texts.size() * n_bytes);
    for (const std::string& text : texts) {
        ensure(text.empty() || text.back() != '\0',
               "a stored text does not end in a zero byte");
        all += text;
        all.append(n_bytes - text.size(), '\0');
    }
    return all;
}

}  // namespace

OutputError Writer::failure(const std::string& object, const std::string& reason) const {
    const std::string place = object.empty() ? path_.string() : path_.string() + ": " + object;
    return OutputError({place, "cannot be written: " + reason, "", ""});
}

template <class Call>
auto Writer::attempt(const std::string& object, Call&& call) const {
    return translated(std::forward<Call>(call),
                      [&](const std::string& reason) { return failure(object, reason); });
}

Writer::Writer(const std::filesystem::path& path, const Descriptor* base, Pages room)
    : path_(path), parts_(std::make_unique<Parts>()) {
    attempt("", [&] { parts_->draft = std::make_unique<DraftFile>(base, std::move(room)); });
}

Writer::~Writer() = default;

void Writer::group(const std::string& path, const std::string& meaning) {
    attempt(path, [&] {
        const hid_t list = checked(H5Pcreate(H5P_GROUP_CREATE), "H5Pcreate");
        checked(H5Pset_obj_track_times(list, false), "H5Pset_obj_track_times");
        const hid_t id = checked(
            H5Gcreate2(parts_->file().getId(), path.c_str(), H5P_DEFAULT, list, H5P_DEFAULT),
            "H5Gcreate");
        checked(H5Gclose(id), "H5Gclose");
        checked(H5Pclose(list), "H5Pclose");
    });
    attribute(path, "meaning", meaning);
}

void Writer::set_attribute(const std::string& object,
                           const std::string& name,
                           const Elements& value) {
    attempt(object + "@" + name, [&] {
        const hid_t file = parts_->file().getId();
        if (checked(H5Aexists_by_name(file, object.c_str(), name.c_str(), H5P_DEFAULT),
                    "H5Aexists") > 0)
            checked(H5Adelete_by_name(file, object.c_str(), name.c_str(), H5P_DEFAULT),
                    "H5Adelete");
        const hid_t id = checked(H5Acreate_by_name(file,
                                                   object.c_str(),
                                                   name.c_str(),
                                                   value.in_file.getId(),
                                                   H5::DataSpace(H5S_SCALAR).getId(),
                                                   H5P_DEFAULT,
                                                   H5P_DEFAULT,
                                                   H5P_DEFAULT),
                                 "H5Acreate");
        checked(H5Awrite(id, value.in_memory.getId(), value.data), "H5Awrite");
        checked(H5Aclose(id), "H5Aclose");
    });
}

void Writer::attribute(const std::string& object,
                       const std::string& name,
                       const std::string& value) {
    const std::size_t n_bytes = longest({value});
    set_attribute(object, name, Elements(padded({value}, n_bytes), n_bytes));
}

void Writer::attribute(const std::string& object, const std::string& name, std::int64_t value) {
    set_attribute(object, name, Elements(std::span<const std::int64_t>(&value, 1)));
}

void Writer::attribute(const std::string& object, const std::string& name, double value) {
    set_attribute(object, name, Elements(std::span<const double>(&value, 1)));
}

void Writer::create(const std::string& path, const About& about, const Layout& layout) {
    attempt(path, [&] {
        parts_->file().createDataSet(
            path,
            layout.type,
            space_of(layout.shape, layout.grows),
            storage(layout.chunk, layout.packing == Packing::deflated));
    });
    attribute(path, "meaning", about.meaning);
    if (!about.unit.empty()) attribute(path, "unit", about.unit);
    attribute(path, "dimensions", about.dimensions);
}

void Writer::write_new(const std::string& path,
                       const About& about,
                       const Layout& layout,
                       const Elements& elements) {
    ensure(n_elements(layout.shape) == elements.count, "a dataset has values for its shape");
    create(path, about, layout);
    if (elements.count == 0) return;
    attempt(path, [&] {
        const H5::DataSet set = parts_->file().openDataSet(path);
        set.write(elements.data, elements.in_memory);
    });
}

void Writer::dataset(const std::string& path,
                     const About& about,
                     const Shape& shape,
                     std::span<const double> values,
                     const Shape& chunk) {
    const Elements elements(values);
    Layout layout{elements.in_file, shape, {}, false};
    // An empty dataset has nothing to put into chunks.
    if (!values.empty())
        layout.chunk = chunk.empty() ? chunk_for(shape) : fitted(chunk, shape, false);
    write_new(path, about, layout, elements);
}

void Writer::dataset(const std::string& path,
                     const About& about,
                     const Shape& shape,
                     std::span<const std::int64_t> values) {
    const Elements elements(values);
    const Shape chunk = values.empty() ? Shape{} : chunk_for(shape);
    write_new(path, about, {elements.in_file, shape, chunk, false}, elements);
}

void Writer::dataset(const std::string& path,
                     const About& about,
                     const Shape& shape,
                     std::span<const std::uint32_t> values) {
    const Elements elements(values);
    const Shape chunk = values.empty() ? Shape{} : chunk_for(shape);
    write_new(path, about, {elements.in_file, shape, chunk, false}, elements);
}

void Writer::dataset(const std::string& path,
                     const About& about,
                     const std::vector<std::string>& texts) {
    const std::size_t n_bytes = longest(texts);
    const std::string all = padded(texts, n_bytes);
    const Shape shape{texts.size()};
    const Shape chunk = texts.empty() ? Shape{} : shape;
    const Elements elements(all, n_bytes);
    write_new(path, about, {elements.in_file, shape, chunk, false}, elements);
}

void Writer::growing_reals(const std::string& path,
                           const About& about,
                           const Shape& entry,
                           const Shape& chunk,
                           Packing packing) {
    Shape shape{0};
    shape.insert(shape.end(), entry.begin(), entry.end());
    create(path,
           about,
           {H5::PredType::IEEE_F64LE, shape, fitted(chunk, shape, true), true, packing});
}

void Writer::growing_integers(const std::string& path,
                              const About& about,
                              const Shape& entry,
                              const Shape& chunk) {
    Shape shape{0};
    shape.insert(shape.end(), entry.begin(), entry.end());
    create(path, about, {H5::PredType::STD_I64LE, shape, fitted(chunk, shape, true), true});
}

void Writer::append_elements(const std::string& path, const Elements& elements) {
    if (elements.count == 0) return;
    attempt(path, [&] {
        const H5::DataSet set = parts_->file().openDataSet(path);
        Shape shape = shape_of(set.getSpace());
        std::vector<hsize_t> start(shape.size(), 0), count = extents(shape);
        count[0] = 1;
        const std::size_t per_entry = n_elements(Shape(count.begin(), count.end()));
        ensure(elements.count % per_entry == 0, "whole entries are appended");
        count[0] = elements.count / per_entry;
        start[0] = shape[0];
        shape[0] += count[0];
        set.extend(extents(shape).data());
        const Entries entries{start[0],
                              Shape(count.begin(), count.end()),
                              static_cast<const char*>(elements.data)};
        if (write_whole_chunks(set, entries, *parts_->draft)) return;
        H5::DataSpace in_file = set.getSpace();
        in_file.selectHyperslab(H5S_SELECT_SET, count.data(), start.data());
        const H5::DataSpace in_memory(static_cast<int>(count.size()), count.data());
        set.write(elements.data, elements.in_memory, in_memory, in_file);
    });
}

void Writer::append(const std::string& path, std::span<const double> values) {
    append_elements(path, Elements(values));
}

void Writer::append(const std::string& path, std::span<const std::int64_t> values) {
    append_elements(path, Elements(values));
}

Draft Writer::close() {
    return attempt("", [&] { return parts_->draft->close(); });
}

}  // namespace deviascope::h5
