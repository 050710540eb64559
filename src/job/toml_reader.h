// SPDX-License-Identifier: GPL-2.0-or-later
// JOB: the only place that knows toml++
#pragma once

#include <toml++/toml.h>
#include <Eigen/Core>
#include <cstdint>
#include <functional>
#include <map>
#include <optional>
#include <string>
#include <string_view>
#include <utility>
#include <vector>

#include "deviascope/core/error.h"
#include "job/number_range.h"

namespace deviascope {

/// Whether a key may be left out.
enum class Presence { optional, required };
inline constexpr Presence required = Presence::required;

/// `"a", "b" or "c"`, for messages.
std::string listed(const std::vector<std::string>& names, const char* last_joint = " or ");
/// `did you mean "nearest"?`, or nothing where no known name is near.
std::string suggestion(std::string_view written, const std::vector<std::string>& known);

class TomlTable;

/// A TOML text and the faults found in it so far.
///
/// Readers take what they need through TomlTable handles; a wrong value is noted as a fault and
/// read as absent, so that one pass finds every fault. `finish` reports the keys nobody asked
/// for and throws if anything is wrong.
class TomlDocument {
  public:
    /// @param name  of the file, as the messages shall call it
    /// Errors: UsageError with line and column where the text is not TOML 1.0.
    TomlDocument(std::string_view text, std::string name);
    TomlDocument(const TomlDocument&) = delete;
    TomlDocument& operator=(const TomlDocument&) = delete;

    const std::string& name() const { return name_; }
    TomlTable root();

    /// Errors: UsageError with all faults in the order of their lines.
    void finish();

  private:
    friend class TomlTable;
    struct Fault {
        toml::source_position place;
        Message message;
    };

    void add(const toml::source_position& place,
             const std::string& path,
             std::string found,
             std::string allowed,
             std::string remedy);
    void report_unknown_keys();

    std::string name_;
    toml::table table_;
    std::vector<Fault> faults_;
    struct Visit {
        std::string path;
        std::vector<std::string> asked;  ///< keys known here, in the order of asking
        bool ignore_rest = false;
    };
    std::map<const toml::table*, Visit> visits_;
};

/// One table of a document: a light handle, valid as long as the document.
///
/// Every reading function makes its key known, notes a fault where the value is not what it
/// accepts, and returns nothing then or where the key is absent. A handle to a table that is
/// absent reads every key as absent (required ones are faults); a handle to something that is
/// not a table, which is a fault by itself, reads all as absent without further faults.
class TomlTable {
  public:
    /// Key path for messages: `survey[2].bin[1].weight`, counted from 1.
    const std::string& path() const { return path_; }
    /// True where the table is there.
    explicit operator bool() const { return table_ != nullptr; }
    /// Line of the table in the file, from 1.
    std::uint32_t line() const { return place_.line; }

    bool has(const std::string& key) const;
    bool has_text(const std::string& key) const;
    bool has_table(const std::string& key) const;
    /// All keys of the table, in the order of the file; none of them becomes known.
    std::vector<std::string> keys() const;

    /// A text that is not empty.
    std::optional<std::string> text(const std::string& key,
                                    Presence presence = Presence::optional) const;
    /// One text or an array of them, not empty.
    std::vector<std::string> texts(const std::string& key,
                                   Presence presence = Presence::optional) const;
    /// A number; an integer is one.
    std::optional<double> number(const std::string& key,
                                 const NumberRange& range = {},
                                 Presence presence = Presence::optional) const;
    /// An integer within low … high; 3.0 is none.
    std::optional<std::int64_t> integer(const std::string& key,
                                        std::int64_t low,
                                        std::int64_t high,
                                        Presence presence = Presence::optional) const;
    std::optional<bool> boolean(const std::string& key,
                                Presence presence = Presence::optional) const;
    /// One of the names, as its index.
    std::optional<std::size_t> choice(const std::string& key,
                                      const std::vector<std::string>& names,
                                      Presence presence = Presence::optional) const;
    /// An array of n numbers.
    std::optional<Eigen::VectorXd> numbers(const std::string& key,
                                           Eigen::Index n,
                                           const NumberRange& range = {},
                                           Presence presence = Presence::optional) const;
    /// n rows of n numbers.
    std::optional<Eigen::MatrixXd> matrix(const std::string& key,
                                          Eigen::Index n,
                                          Presence presence = Presence::optional) const;
    TomlTable table(const std::string& key) const;
    /// An array of tables, `[[key]]` or inline.
    std::vector<TomlTable> tables(const std::string& key,
                                  Presence presence = Presence::optional) const;

    /// Notes a fault at the value of a key (at the table where the key is absent).
    void fault(const std::string& key,
               std::string found,
               std::string allowed,
               std::string remedy = {}) const;
    /// Notes a fault of the table itself.
    void fault_here(std::string found, std::string allowed, std::string remedy = {}) const;
    /// Notes that the value of a key, shown as it was written, is not allowed.
    void wrong(const std::string& key,
               const std::string& allowed,
               std::string remedy = {}) const;
    /// Notes the faults of another file that a key refers to, at the place of that key.
    void adopt(const std::string& key, const std::vector<Message>& faults) const;
    /// Makes a key known that must not be there, for the reason given.
    void refuse(const std::string& key, std::string why, std::string remedy) const;
    /// No faults for keys that nobody asks for: where what is known hangs on a faulty value.
    void ignore_unknown_keys() const;
    /// Line of a key's value, from 1; of the table where it is absent.
    std::uint32_t line_of(const std::string& key) const;

  private:
    friend class TomlDocument;
    TomlTable(TomlDocument& document,
              const toml::table* table,
              std::string path,
              toml::source_position place);

    const toml::node* find(const std::string& key) const;
    std::string path_of(const std::string& key) const;
    toml::source_position place_of(const std::string& key) const;
    void missing(const std::string& key, const std::string& allowed, Presence presence) const;

    /// What `convert` makes of a key's value; a fault where it makes nothing of it.
    template <class Value>
    std::optional<Value> read(
        const std::string& key,
        const std::string& allowed,
        Presence presence,
        const std::function<std::optional<Value>(const toml::node&)>& convert) const;

    TomlDocument* document_;
    const toml::table* table_;
    std::string path_;
    toml::source_position place_;
    bool silent_ = false;  ///< stands for something faulty: no further faults
};

}  // namespace deviascope
