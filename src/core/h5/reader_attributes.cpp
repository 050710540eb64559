// SPDX-License-Identifier: GPL-2.0-or-later
#include "core/h5/open_file.h"

namespace deviascope::h5 {

namespace {

/// An attribute of a group or dataset, whichever `object` is; empty where absent.
std::optional<H5::Attribute> find_attribute(const H5::H5File& file,
                                            const std::string& object,
                                            const std::string& name) {
    const htri_t is_there =
        checked(H5Aexists_by_name(file.getId(), object.c_str(), name.c_str(), H5P_DEFAULT),
                "H5Aexists");
    if (is_there == 0) return {};
    const hid_t id = checked(
        H5Aopen_by_name(file.getId(), object.c_str(), name.c_str(), H5P_DEFAULT, H5P_DEFAULT),
        "H5Aopen");
    H5::Attribute attribute(id);  // counts one use more
    H5Aclose(id);
    return attribute;
}

/// Old writers use an array of one for a scalar.
bool is_scalar(const H5::Attribute& attribute) {
    return n_elements(shape_of(attribute.getSpace())) == 1;
}

/// What the library calls the type of a value, what a user does, and how one is read.
template <class Value>
struct Stored;

template <>
struct Stored<std::string> {
    static constexpr H5T_class_t type = H5T_STRING;
    static constexpr const char* words = "a text";
    static std::string read(const H5::Attribute& attribute) {
        H5std_string value;
        attribute.read(attribute.getStrType(), value);
        return value.substr(0, value.find('\0'));
    }
};

template <>
struct Stored<std::int64_t> {
    static constexpr H5T_class_t type = H5T_INTEGER;
    static constexpr const char* words = "an integer";
    static std::int64_t read(const H5::Attribute& attribute) {
        std::int64_t value = 0;
        attribute.read(H5::PredType::NATIVE_INT64, &value);
        return value;
    }
};

template <>
struct Stored<double> {
    static constexpr H5T_class_t type = H5T_FLOAT;
    static constexpr const char* words = "a real number";
    static double read(const H5::Attribute& attribute) {
        double value = 0.0;
        attribute.read(H5::PredType::NATIVE_DOUBLE, &value);
        return value;
    }
};

}  // namespace

template <class Value>
std::optional<Value> Reader::attribute(const std::string& object,
                                       const std::string& name) const {
    const std::string place = object + "@" + name;
    const auto refuse = [&](const std::string& reason) { return failure(place, reason); };
    const auto found =
        translated([&] { return find_attribute(parts_->file, object, name); }, refuse);
    if (!found) return {};
    return translated(
        [&] {
            if (!is_scalar(*found) || found->getTypeClass() != Stored<Value>::type)
                throw error(
                    place, "of another type", std::string(Stored<Value>::words) + " is needed");
            return std::optional<Value>(Stored<Value>::read(*found));
        },
        refuse);
}

std::optional<std::string> Reader::text(const std::string& object,
                                        const std::string& name) const {
    return attribute<std::string>(object, name);
}

std::optional<std::int64_t> Reader::integer(const std::string& object,
                                            const std::string& name) const {
    return attribute<std::int64_t>(object, name);
}

std::optional<double> Reader::real(const std::string& object, const std::string& name) const {
    return attribute<double>(object, name);
}

template <class Value>
Value Reader::required(const std::string& object, const std::string& name) const {
    const std::optional<Value> found = attribute<Value>(object, name);
    if (!found) throw missing(object + "@" + name);
    return *found;
}

std::string Reader::required_text(const std::string& object, const std::string& name) const {
    return required<std::string>(object, name);
}

std::int64_t Reader::required_integer(const std::string& object,
                                      const std::string& name) const {
    return required<std::int64_t>(object, name);
}

double Reader::required_real(const std::string& object, const std::string& name) const {
    return required<double>(object, name);
}

}  // namespace deviascope::h5
