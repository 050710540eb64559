// SPDX-License-Identifier: GPL-2.0-or-later
#include "sky/map_card.h"

#include <array>
#include <utility>

namespace deviascope {

namespace {

std::string upper(std::string text) {
    for (char& c : text)
        if (c >= 'a' && c <= 'z') c = char(c - 'a' + 'A');
    return text;
}

/// Spellings met in published maps; C and Q are both in use for celestial coordinates.
std::optional<Frame> frame_of_card(const std::filesystem::path& path, const std::string& word) {
    static constexpr std::array<std::pair<std::string_view, Frame>, 10> spellings{
        {{"G", Frame::galactic},
         {"GALACTIC", Frame::galactic},
         {"C", Frame::icrs},
         {"Q", Frame::icrs},
         {"CELESTIAL", Frame::icrs},
         {"EQUATORIAL", Frame::icrs},
         {"ICRS", Frame::icrs},
         {"CELESTIAL2000", Frame::icrs},
         {"E", Frame::ecliptic},
         {"ECLIPTIC", Frame::ecliptic}}};
    if (word.empty()) return {};
    for (const auto& [spelling, frame] : spellings)
        if (word == spelling) return frame;
    throw card_error(path,
                     "COORDSYS",
                     word,
                     "G (galactic), C (celestial, ICRS) or E (ecliptic)",
                     "correct the header, or rotate the map into one of these frames");
}

}  // namespace

std::string word_card(const fits::Table& table, const std::string& keyword) {
    std::string word = upper(table.text_card(keyword).value_or(""));
    std::erase(word, ' ');
    return word;
}

InputError card_error(const std::filesystem::path& path,
                      const std::string& keyword,
                      const std::string& value,
                      const std::string& allowed,
                      const std::string& remedy) {
    return InputError({path.string() + ": " + keyword,
                       value.empty() ? "the card is missing" : "its value is " + value,
                       allowed,
                       remedy});
}

std::optional<Frame> frame_card(const fits::Table& table, const std::filesystem::path& path) {
    return frame_of_card(path, word_card(table, "COORDSYS"));
}

}  // namespace deviascope
