// SPDX-License-Identifier: GPL-2.0-or-later
// CORE: under all stages
#pragma once

#include <stdexcept>
#include <string>
#include <string_view>
#include <vector>

namespace deviascope {

/// What a user is told, in one grammar: `place: what was found; what is allowed; what to do`.
/// Empty parts are left out together with their punctuation.
struct Message {
    std::string place;    ///< file, and line, column, row, key or option inside it
    std::string found;    ///< what was found there; the offending value is always shown
    std::string allowed;  ///< what would have been accepted
    std::string remedy;   ///< what the user can do about it

    /// The message on one line (control characters of quoted input are escaped).
    std::string text() const;
};

/// Exit codes of the program; documented in the README.
enum class ExitCode : int {
    done = 0,
    usage = 2,
    input = 3,
    numerics = 4,
    output = 5,
    doubtful = 6,
    internal = 70,
    interrupted = 130
};

/// Base of everything the library throws on purpose. `what()` is the whole text, one line a
/// fault.
class Error : public std::runtime_error {
  public:
    ExitCode exit_code() const noexcept { return code_; }
    /// The faults, at least one.
    const std::vector<Message>& messages() const noexcept { return messages_; }

  protected:
    Error(ExitCode code, std::vector<Message> messages);

  private:
    ExitCode code_;
    std::vector<Message> messages_;
};

/// Wrong command line or job file; holds *all* faults found, not only the first. Exit 2.
class UsageError : public Error {
  public:
    explicit UsageError(Message message);
    explicit UsageError(std::vector<Message> messages);
};

/// A data file, row, column or attribute is wrong. Exit 3.
class InputError : public Error {
  public:
    explicit InputError(Message message);
};

/// The numerics cannot start or go on; the message gives the parameter values. Exit 4.
class NumericalError : public Error {
  public:
    explicit NumericalError(Message message);
};

/// Something cannot be written, or exists and may not be replaced. Exit 5.
class OutputError : public Error {
  public:
    explicit OutputError(Message message);
};

/// A broken invariant of our own. Exit 70. Thrown by `ensure` only.
class InternalError : public Error {
  public:
    explicit InternalError(Message message);
};

/// Checks an invariant of our own, in every build; `what` says what should have held.
/// Errors: InternalError with file and line.
void ensure(bool condition,
            std::string_view what,
            const char* file = __builtin_FILE(),
            int line = __builtin_LINE());

}  // namespace deviascope
