// SPDX-License-Identifier: GPL-2.0-or-later
#include "deviascope/core/error.h"

#include <fmt/format.h>

#include <utility>

namespace deviascope {

namespace {

/// Control characters of quoted input must not reach a terminal; UTF-8 passes.
std::string printable(std::string_view text) {
    std::string out;
    for (const char c : text) {
        const auto byte = static_cast<unsigned char>(c);
        if (c == '\n' || c == '\t') {
            out += ' ';
        } else if (byte < 0x20 || byte == 0x7f) {
            out += fmt::format("\\x{:02x}", byte);
        } else {
            out += c;
        }
    }
    return out;
}

std::string joined(const std::vector<Message>& messages) {
    std::string text;
    for (const Message& message : messages) {
        if (!text.empty()) text += '\n';
        text += message.text();
    }
    return text;
}

}  // namespace

std::string Message::text() const {
    std::string out = printable(place);
    if (!found.empty()) out += (out.empty() ? "" : ": ") + printable(found);
    if (!allowed.empty()) out += "; " + printable(allowed);
    if (!remedy.empty()) out += "; " + printable(remedy);
    return out;
}

Error::Error(ExitCode code, std::vector<Message> messages)
    : std::runtime_error(joined(messages)), code_(code), messages_(std::move(messages)) {}

UsageError::UsageError(Message message)
    : UsageError(std::vector<Message>{std::move(message)}) {}
UsageError::UsageError(std::vector<Message> messages)
    : Error(ExitCode::usage, std::move(messages)) {}

InputError::InputError(Message message) : Error(ExitCode::input, {std::move(message)}) {}

NumericalError::NumericalError(Message message)
    : Error(ExitCode::numerics, {std::move(message)}) {}

OutputError::OutputError(Message message) : Error(ExitCode::output, {std::move(message)}) {}

InternalError::InternalError(Message message)
    : Error(ExitCode::internal, {std::move(message)}) {}

void ensure(bool condition, std::string_view what, const char* file, int line) {
    if (condition) return;
    throw InternalError({fmt::format("{}:{}", file, line),
                         fmt::format("this should hold but does not: {}", what),
                         "",
                         "this is a fault of the program; please report it with the job file"});
}

}  // namespace deviascope
