// SPDX-License-Identifier: GPL-2.0-or-later
// SKY (private): header cards that maps and MOCs share
#pragma once

#include <filesystem>
#include <optional>
#include <string>

#include "core/fits/fits_file.h"
#include "deviascope/core/error.h"
#include "deviascope/sky/frame.h"

namespace deviascope {

/// A text card without blanks and in capitals; empty where there is none.
std::string word_card(const fits::Table& table, const std::string& keyword);

/// The error of a card with that value; an empty value is a card that is missing.
InputError card_error(const std::filesystem::path& path,
                      const std::string& keyword,
                      const std::string& value,
                      const std::string& allowed,
                      const std::string& remedy = "correct the header of the map");

/// The frame that COORDSYS names, in any spelling that is met (`read_healpix_map`); empty where
/// there is no such card. Errors: InputError: another word.
std::optional<Frame> frame_card(const fits::Table& table, const std::filesystem::path& path);

}  // namespace deviascope
