// SPDX-License-Identifier: GPL-2.0-or-later
#include "figures/fonts.h"

#include <fmt/format.h>
#include <ft2build.h>
#include FT_FREETYPE_H

#include <array>
#include <map>

#include "deviascope/core/error.h"

namespace deviascope {

namespace fs = std::filesystem;

namespace {

constexpr std::array<const char*, 4> folders = {"/usr/share/fonts/truetype/open-sans",
                                                "/usr/share/fonts/truetype/dejavu",
                                                "/usr/share/fonts/open-sans",
                                                "/usr/local/share/fonts"};

fs::path find_font(const std::string& name) {
    for (const char* folder : folders)
        if (fs::exists(fs::path(folder) / name)) return fs::path(folder) / name;
    return {};
}

constexpr char32_t replacement = 0xFFFD;

/// The letter that begins at `at`, which moves behind it; U+FFFD for what is no UTF-8.
char32_t next_letter(const std::string& text, std::size_t& at) {
    const auto byte = [&](std::size_t place) {
        return place < text.size() ? static_cast<unsigned char>(text[place]) : 0u;
    };
    const unsigned first = byte(at++);
    if (first < 0x80u) return first;
    const int more = first >= 0xF0u ? 3 : first >= 0xE0u ? 2 : 1;
    if (first < 0xC2u || first > 0xF4u) return replacement;
    char32_t letter = first & (0x3Fu >> more);
    for (int step = 0; step < more; ++step) {
        if ((byte(at) & 0xC0u) != 0x80u) return replacement;
        letter = letter << 6 | (byte(at++) & 0x3Fu);
    }
    const bool is_surrogate = letter >= 0xD800 && letter <= 0xDFFF;
    return is_surrogate || letter > 0x10FFFF ? replacement : letter;
}

bool is_control(char32_t letter) {
    return letter < 0x20 || (letter >= 0x7F && letter < 0xA0) || letter == 0xFFFE ||
           letter == 0xFFFF;
}

/// One for the process: Cairo keeps faces of its own accord for a while.
FT_Library font_library() {
    static const FT_Library library = [] {
        FT_Library made = nullptr;
        ensure(FT_Init_FreeType(&made) == 0, "the font library starts");
        return made;
    }();
    return library;
}

}  // namespace

struct Fonts::Parts {
    std::vector<FT_Face> faces;
    std::array<std::vector<std::size_t>, 3> order;  ///< files to look in, per Face
    std::string family = "Open Sans";
    mutable std::map<std::pair<std::size_t, FT_UInt>, double> advance;  ///< in sizes

    ~Parts() {
        for (FT_Face face : faces) FT_Done_Face(face);
    }

    /// False where it is no font.
    bool open(const fs::path& path) {
        FT_Face face = nullptr;
        if (path.empty() || FT_New_Face(font_library(), path.c_str(), 0, &face) != 0)
            return false;
        faces.push_back(face);
        return true;
    }

    void open_for(Face face, const fs::path& path) {
        if (open(path)) order[static_cast<std::size_t>(face)].push_back(faces.size() - 1);
    }

    /// File and glyph of a letter: of the first file that has it, else that file's empty box.
    std::pair<std::size_t, FT_UInt> find(Face face, char32_t letter) const {
        const auto& files = order[static_cast<std::size_t>(face)];
        for (const std::size_t file : files)
            if (const FT_UInt glyph = FT_Get_Char_Index(faces[file], letter))
                return {file, glyph};
        return {files.front(), 0};
    }

    double advance_of(std::size_t file, FT_UInt glyph) const {
        const auto [at, is_new] = advance.try_emplace({file, glyph}, 0.0);
        if (is_new && FT_Load_Glyph(faces[file], glyph, FT_LOAD_NO_SCALE) == 0)
            at->second = static_cast<double>(faces[file]->glyph->metrics.horiAdvance) /
                         static_cast<double>(faces[file]->units_per_EM);
        return at->second;
    }
};

Fonts::Fonts(const fs::path& own) : parts_(std::make_unique<Parts>()) {
    if (!own.empty()) {
        if (!parts_->open(own))
            throw UsageError({own.string(),
                              "is not a font that can be read",
                              "a TrueType or OpenType file",
                              "leave --font out, or name another file"});
        for (auto& files : parts_->order) files.push_back(0);
        parts_->family = parts_->faces[0]->family_name;
    }
    parts_->open_for(Face::regular, find_font("OpenSans-Regular.ttf"));
    parts_->open_for(Face::semibold, find_font("OpenSans-Semibold.ttf"));
    parts_->open_for(Face::italic, find_font("OpenSans-Italic.ttf"));
    parts_->open_for(Face::regular, find_font("DejaVuSans.ttf"));
    parts_->open_for(Face::semibold, find_font("DejaVuSans-Bold.ttf"));
    for (auto& files : parts_->order)  // a face that is missing is set in the plain one
        for (const std::size_t file : std::vector<std::size_t>(parts_->order[0]))
            if (&files != &parts_->order[0]) files.push_back(file);
    if (parts_->order[0].empty())
        throw OutputError({"fonts",
                           "neither Open Sans nor DejaVu Sans is found",
                           "figures need one of them",
                           "install fonts-open-sans or fonts-dejavu-core, or name a font file "
                           "with --font"});
}

Fonts::~Fonts() = default;

std::vector<PlacedGlyph> Fonts::glyphs(const Line& line) const {
    std::vector<PlacedGlyph> placed;
    double x = 0.0;
    for (const Run& run : line)
        for (std::size_t at = 0; at < run.text.size();) {
            const std::size_t begin = at;
            const auto [file, glyph] = parts_->find(run.face, next_letter(run.text, at));
            placed.push_back({file, glyph, x, run.rise, run.scale, at - begin});
            x += run.scale * parts_->advance_of(file, glyph);
        }
    return placed;
}

double Fonts::width(const Line& line, double size) const {
    double width = 0.0;
    for (const PlacedGlyph& glyph : glyphs(line))
        width += glyph.scale * parts_->advance_of(glyph.file, FT_UInt(glyph.index));
    return width * size;
}

double Fonts::width(const std::string& text, double size, Face face) const {
    return width(Line{{text, face}}, size);
}

void* Fonts::face(std::size_t file) const {
    return parts_->faces[file];
}

std::size_t Fonts::n_files() const {
    return parts_->faces.size();
}

std::string Fonts::family() const {
    return parts_->family;
}

std::string Fonts::library_version() {
    FT_Int major = 0, minor = 0, patch = 0;
    FT_Library_Version(font_library(), &major, &minor, &patch);
    return fmt::format("{}.{}.{}", major, minor, patch);
}

std::string printable(const std::string& text) {
    std::string clean;
    for (std::size_t at = 0; at < text.size();) {
        const std::size_t begin = at;
        const char32_t letter = next_letter(text, at);
        if (letter == replacement)
            clean += "\xEF\xBF\xBD";
        else if (is_control(letter))
            clean += ' ';
        else
            clean.append(text, begin, at - begin);
    }
    return clean;
}

std::string shortened(const Fonts& fonts, const std::string& text, double size, double width) {
    if (fonts.width(text, size) <= width) return text;
    std::vector<std::size_t> starts;  // of letters
    for (std::size_t at = 0; at < text.size(); next_letter(text, at)) starts.push_back(at);
    for (std::size_t kept = starts.size() - 1; kept > 1; --kept) {
        const std::size_t head = (kept + 1) / 2, tail = kept / 2;
        const std::string cut =
            text.substr(0, starts[head]) + "…" + text.substr(starts[starts.size() - tail]);
        if (fonts.width(cut, size) <= width) return cut;
    }
    return "…";
}

std::vector<std::string> wrapped(const Fonts& fonts,
                                 const std::string& text,
                                 double size,
                                 double width) {
    std::vector<std::string> lines(1);
    for (std::size_t begin = 0; begin < text.size();) {
        const std::size_t end = std::min(text.find(' ', begin), text.size());
        const std::string word = shortened(fonts, text.substr(begin, end - begin), size, width);
        const std::string joined = lines.back().empty() ? word : lines.back() + " " + word;
        if (fonts.width(joined, size) <= width)
            lines.back() = joined;
        else
            lines.push_back(word);
        begin = end + 1;
    }
    return lines;
}

}  // namespace deviascope
