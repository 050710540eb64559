// SPDX-License-Identifier: GPL-2.0-or-later
#include <fmt/format.h>

#include <algorithm>
#include <charconv>
#include <cmath>

#include "figures/backends.h"

namespace deviascope {
namespace {

/// At most two decimals, the same in every locale, never "-0".
std::string number(double value) {
    const double rounded = std::round(value * 100.0) / 100.0;
    if (rounded == 0.0) return "0";
    char buffer[32];
    const auto end =
        std::to_chars(buffer, buffer + sizeof buffer, rounded, std::chars_format::fixed, 2);
    std::string text(buffer, end.ptr);
    text.erase(text.find_last_not_of('0') + 1);
    if (text.back() == '.') text.pop_back();
    return text;
}

std::string base64(const std::string& bytes) {
    static constexpr char letters[] =
        "ABCDEFGHIJKLMNOPQRSTUVWXYZabcdefghijklmnopqrstuvwxyz0123456789+/";
    std::string text;
    text.reserve(bytes.size() / 3 * 4 + 4);
    for (std::size_t at = 0; at < bytes.size(); at += 3) {
        const std::size_t n = std::min<std::size_t>(3, bytes.size() - at);
        unsigned group = 0;
        for (std::size_t byte = 0; byte < 3; ++byte)
            group = group << 8 | (byte < n ? static_cast<unsigned char>(bytes[at + byte]) : 0u);
        for (std::size_t letter = 0; letter < 4; ++letter)
            text += letter <= n ? letters[group >> (18 - 6 * letter) & 63u] : '=';
    }
    return text;
}

class SvgWriter {
  public:
    SvgWriter(const Fonts& fonts, const SvgWords& words) : fonts_(fonts), words_(words) {}

    std::string page(const Drawing& drawing) {
        for (const Item& item : drawing.items)
            std::visit([&](const auto& one) { draw(one); }, item);
        return head(drawing) + body_ + "</svg>\n";
    }

  private:
    std::string head(const Drawing& drawing) const {
        const std::string w = number(drawing.width), h = number(drawing.height);
        std::string text;
        if (!words_.inlined) text = "<?xml version=\"1.0\" encoding=\"UTF-8\"?>\n";
        text += fmt::format(
            "<svg xmlns=\"http://www.w3.org/2000/svg\" "
            "xmlns:xlink=\"http://www.w3.org/1999/xlink\"{6} "
            "viewBox=\"0 0 {0} {1}\" role=\"img\" aria-labelledby=\"{2}title {2}desc\" "
            "font-family=\"'{3}','DejaVu Sans',sans-serif\">\n"
            "<title id=\"{2}title\">{4}</title>\n<desc id=\"{2}desc\">{5}</desc>\n",
            w,
            h,
            words_.prefix,
            escaped(fonts_.family()),
            escaped(words_.title),
            escaped(words_.description),
            // In a page the style sheet sets the size.
            words_.inlined ? "" : fmt::format(" width=\"{}pt\" height=\"{}pt\"", w, h));
        if (!words_.inlined)
            text += fmt::format("<rect width=\"{}\" height=\"{}\" fill=\"#FFFFFF\"/>\n", w, h);
        return text;
    }

    /// An attribute `fill` or `stroke`, with its opacity.
    std::string paint(const char* attribute, const Colour& colour) const {
        const std::string hex = colour.hex();
        std::string text =
            words_.inlined
                ? fmt::format(" style=\"{}:var(--c{},{})\"", attribute, hex.substr(1), hex)
                : fmt::format(" {}=\"{}\"", attribute, hex);
        if (colour.alpha < 1.0)
            text += fmt::format(" {}-opacity=\"{}\"", attribute, number(colour.alpha));
        return text;
    }

    std::string inks(const std::optional<Colour>& fill, const std::optional<Stroke>& stroke) {
        std::string text;
        if (fill && stroke && words_.inlined)  // one style attribute an element
            text = fmt::format(" style=\"fill:var(--c{0},#{0});stroke:var(--c{1},#{1})\"",
                               fill->hex().substr(1),
                               stroke->colour.hex().substr(1)) +
                   (fill->alpha < 1.0 ? fmt::format(" fill-opacity=\"{}\"", number(fill->alpha))
                                      : "");
        else
            text = (fill ? paint("fill", *fill) : " fill=\"none\"") +
                   (stroke ? paint("stroke", stroke->colour) : "");
        if (!stroke) return text;
        text += fmt::format(" stroke-width=\"{}\"", number(stroke->width));
        if (!stroke->dash.empty()) {
            std::string lengths;
            for (const double length : stroke->dash)
                lengths += fmt::format("{}{}", lengths.empty() ? "" : " ", number(length));
            text += fmt::format(" stroke-dasharray=\"{}\"", lengths);
        }
        return text;
    }

    static std::string path(const std::vector<Polyline>& pieces) {
        std::string text;
        for (const Polyline& piece : pieces) {
            char letter = 'M';
            for (const Point& point : piece.point) {
                text += letter + number(point.x) + " " + number(point.y);
                letter = 'L';
            }
            if (piece.closed) text += 'Z';
        }
        return text;
    }

    void draw(const Shape& shape) {
        body_ +=
            fmt::format("<path d=\"{}\"{}{}/>\n",
                        path(shape.pieces),
                        inks(shape.fill, shape.stroke),
                        shape.fill ? " fill-rule=\"evenodd\"" : " stroke-linejoin=\"round\"");
    }

    void draw(const Disc& disc) {
        body_ += fmt::format("<circle cx=\"{}\" cy=\"{}\" r=\"{}\"{}/>\n",
                             number(disc.centre.x),
                             number(disc.centre.y),
                             number(disc.radius),
                             inks(disc.fill, disc.stroke));
    }

    std::string spans(const Text& text) const {
        std::string spans;
        double raised = 0.0;  // so far, in points
        for (const Run& run : text.runs) {
            std::string style = run.face == Face::semibold ? " font-weight=\"600\""
                                : run.face == Face::italic ? " font-style=\"italic\""
                                                           : "";
            if (run.scale != 1.0)
                style += fmt::format(" font-size=\"{}\"", number(run.scale * text.size));
            const double rise = run.rise * text.size;
            if (rise != raised) style += fmt::format(" dy=\"{}\"", number(raised - rise));
            raised = rise;
            spans += style.empty()
                         ? escaped(run.text)
                         : fmt::format("<tspan{}>{}</tspan>", style, escaped(run.text));
        }
        return spans;
    }

    void draw(const Text& text) {
        static constexpr const char* anchors[] = {
            "", " text-anchor=\"middle\"", " text-anchor=\"end\""};
        std::string place =
            fmt::format("x=\"{}\" y=\"{}\"", number(text.at.x), number(text.at.y));
        if (text.turn_deg != 0.0)
            place += fmt::format(" transform=\"rotate({} {} {})\"",
                                 number(-text.turn_deg),
                                 number(text.at.x),
                                 number(text.at.y));
        const std::string common = fmt::format("{} font-size=\"{}\"{} xml:space=\"preserve\"",
                                               place,
                                               number(text.size),
                                               anchors[static_cast<int>(text.anchor)]);
        if (text.halo > 0.0)
            body_ += fmt::format(
                "<text {}{} stroke-linejoin=\"round\" aria-hidden=\"true\">{}</text>\n",
                common,
                inks(palette::paper(), Stroke{text.halo, palette::paper()}),
                spans(text));
        body_ += fmt::format(
            "<text {}{}>{}</text>\n", common, paint("fill", text.colour), spans(text));
    }

    void draw(const Image& image) {
        body_ += fmt::format(
            "<image x=\"{}\" y=\"{}\" width=\"{}\" height=\"{}\" "
            "preserveAspectRatio=\"none\" xlink:href=\"data:image/png;base64,{}\"/>\n",
            number(image.box.left),
            number(image.box.top),
            number(image.box.width()),
            number(image.box.height()),
            base64(to_png(*image.raster)));
    }

    void draw(const Clip& clip) {
        const std::string id = fmt::format("{}clip{}", words_.prefix, n_clips_++);
        body_ += fmt::format(
            "<clipPath id=\"{0}\"><path d=\"{1}\"/></clipPath>\n"
            "<g clip-path=\"url(#{0})\">\n",
            id,
            path({clip.edge}));
        for (const auto& item : clip.content)
            std::visit([&](const auto& one) { draw(one); }, item);
        body_ += "</g>\n";
    }

    const Fonts& fonts_;
    const SvgWords& words_;
    std::string body_;
    int n_clips_ = 0;
};

}  // namespace

std::string escaped(const std::string& text) {
    std::string safe;
    for (const char letter : printable(text)) switch (letter) {
            case '&':
                safe += "&amp;";
                break;
            case '<':
                safe += "&lt;";
                break;
            case '>':
                safe += "&gt;";
                break;
            case '"':
                safe += "&quot;";
                break;
            default:
                safe += letter;
        }
    return safe;
}

std::string to_svg(const Drawing& drawing, const Fonts& fonts, const SvgWords& words) {
    return SvgWriter(fonts, words).page(drawing);
}

std::string escaped_lines(const std::string& text) {
    std::string safe;
    for (std::size_t begin = 0; begin < text.size();) {
        const std::size_t end = std::min(text.find_first_of("\n\t", begin), text.size());
        safe += escaped(text.substr(begin, end - begin));
        if (end < text.size()) safe += text[end];
        begin = end + 1;
    }
    return safe;
}

namespace {

std::string properties(Colour (*as)(const Colour&)) {
    std::vector<Colour> colours = {palette::ink(),
                                   palette::grey_text(),
                                   palette::paper(),
                                   palette::panel(),
                                   palette::tile(),
                                   palette::plain_sky(),
                                   palette::mask(),
                                   palette::prior(),
                                   palette::warning()};
    for (std::size_t index = 0; index < 4; ++index)
        for (const Colour& colour :
             {palette::series(index), palette::fill68(index), palette::fill95(index)})
            colours.push_back(colour);
    std::string text;
    for (const Colour& colour : colours)
        text += fmt::format("--c{}:{};", colour.hex().substr(1), as(colour).hex());
    return text;
}

}  // namespace

std::string dark_properties() {
    return properties(palette::on_dark);
}

std::string light_properties() {
    return properties([](const Colour& colour) { return colour; });
}

}  // namespace deviascope
