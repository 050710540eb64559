// SPDX-License-Identifier: GPL-2.0-or-later
#include <cairo/cairo-ft.h>
#include <cairo/cairo-pdf.h>
#include <cairo/cairo.h>

#include <cmath>
#include <memory>
#include <numbers>

#include "deviascope/core/error.h"
#include "deviascope/core/physical_constants.h"
#include "deviascope/figures/figures.h"
#include "figures/backends.h"

namespace deviascope {
namespace {

struct Destroy {
    void operator()(cairo_surface_t* surface) const { cairo_surface_destroy(surface); }
    void operator()(cairo_t* context) const { cairo_destroy(context); }
    void operator()(cairo_font_face_t* face) const { cairo_font_face_destroy(face); }
};
using Surface = std::unique_ptr<cairo_surface_t, Destroy>;
using FontFace = std::unique_ptr<cairo_font_face_t, Destroy>;

void check(cairo_status_t status) {
    if (status != CAIRO_STATUS_SUCCESS)
        throw OutputError({"figure", cairo_status_to_string(status), "", ""});
}

cairo_status_t append(void* to, const unsigned char* bytes, unsigned int n) {
    static_cast<std::string*>(to)->append(reinterpret_cast<const char*>(bytes), n);
    return CAIRO_STATUS_SUCCESS;
}

/// Premultiplied 32-bit pixels.
Surface surface_of(const Raster& raster) {
    Surface surface(
        cairo_image_surface_create(CAIRO_FORMAT_ARGB32, raster.width, raster.height));
    check(cairo_surface_status(surface.get()));
    unsigned char* data = cairo_image_surface_get_data(surface.get());
    const auto stride = static_cast<std::size_t>(cairo_image_surface_get_stride(surface.get()));
    const auto width = static_cast<std::size_t>(raster.width);
    for (std::size_t row = 0; row < static_cast<std::size_t>(raster.height); ++row) {
        auto* line = reinterpret_cast<std::uint32_t*>(data + row * stride);
        for (std::size_t column = 0; column < width; ++column) {
            const Colour& colour = raster.pixel[row * width + column];
            const auto part = [&](double value) {
                return static_cast<std::uint32_t>(std::lround(value * colour.alpha));
            };
            line[column] = part(255.0) << 24 | part(colour.red) << 16 |
                           part(colour.green) << 8 | part(colour.blue);
        }
    }
    cairo_surface_mark_dirty(surface.get());
    return surface;
}

std::string png_of(cairo_surface_t* surface) {
    std::string bytes;
    check(cairo_surface_write_to_png_stream(surface, append, &bytes));
    return bytes;
}

/// Cairo keeps a face for a while after it was given up: the file stays open as long.
FontFace font_face_of(FT_Face file) {
    static const cairo_user_data_key_t key{};
    FontFace face(cairo_ft_font_face_create_for_ft_face(file, FT_LOAD_NO_HINTING));
    if (cairo_font_face_get_user_data(face.get(), &key) != nullptr) return face;
    FT_Reference_Face(file);
    const auto close = [](void* open) { FT_Done_Face(static_cast<FT_Face>(open)); };
    check(cairo_font_face_set_user_data(face.get(), &key, file, close));
    return face;
}

class CairoWriter {
  public:
    CairoWriter(cairo_surface_t* surface, const Fonts& fonts)
        : context_(cairo_create(surface)), fonts_(fonts) {
        for (std::size_t file = 0; file < fonts.n_files(); ++file)
            faces_.push_back(font_face_of(static_cast<FT_Face>(fonts.face(file))));
        cairo_set_line_join(cr(), CAIRO_LINE_JOIN_ROUND);
        cairo_font_options_t* options = cairo_font_options_create();
        cairo_font_options_set_antialias(options, CAIRO_ANTIALIAS_GRAY);
        cairo_font_options_set_hint_style(options, CAIRO_HINT_STYLE_NONE);
        cairo_font_options_set_hint_metrics(options, CAIRO_HINT_METRICS_OFF);
        cairo_set_font_options(cr(), options);
        cairo_font_options_destroy(options);
    }

    void scale(double factor) { cairo_scale(cr(), factor, factor); }

    void page(const Drawing& drawing) {
        for (const Item& item : drawing.items)
            std::visit([&](const auto& one) { draw(one); }, item);
        check(cairo_status(cr()));
    }

    void fill_page(const Colour& colour) {
        set(colour);
        cairo_paint(cr());
    }

  private:
    cairo_t* cr() const { return context_.get(); }

    void set(const Colour& colour) {
        cairo_set_source_rgba(
            cr(), colour.red / 255.0, colour.green / 255.0, colour.blue / 255.0, colour.alpha);
    }

    void trace(const std::vector<Polyline>& pieces) {
        cairo_new_path(cr());
        for (const Polyline& piece : pieces) {
            cairo_new_sub_path(cr());
            for (const Point& point : piece.point) cairo_line_to(cr(), point.x, point.y);
            if (piece.closed) cairo_close_path(cr());
        }
    }

    /// Fills and strokes the path that is there.
    void ink(const std::optional<Colour>& fill, const std::optional<Stroke>& stroke) {
        if (fill) {
            set(*fill);
            cairo_fill_preserve(cr());
        }
        if (stroke) {
            set(stroke->colour);
            cairo_set_line_width(cr(), stroke->width);
            cairo_set_dash(
                cr(), stroke->dash.data(), static_cast<int>(stroke->dash.size()), 0.0);
            cairo_stroke_preserve(cr());
        }
        cairo_new_path(cr());
    }

    void draw(const Shape& shape) {
        trace(shape.pieces);
        cairo_set_fill_rule(cr(), CAIRO_FILL_RULE_EVEN_ODD);
        ink(shape.fill, shape.stroke);
    }

    void draw(const Disc& disc) {
        cairo_new_path(cr());
        cairo_arc(cr(), disc.centre.x, disc.centre.y, disc.radius, 0.0, 2.0 * std::numbers::pi);
        ink(disc.fill, disc.stroke);
    }

    void draw(const Text& text) {
        const double width = fonts_.width(text.runs, text.size);
        const double shift = text.anchor == Anchor::start    ? 0.0
                             : text.anchor == Anchor::middle ? 0.5 * width
                                                             : width;
        cairo_save(cr());
        cairo_translate(cr(), text.at.x, text.at.y);
        cairo_rotate(cr(), -text.turn_deg * radians_per_degree);
        cairo_translate(cr(), -shift, 0.0);
        if (text.halo > 0.0) {
            show(text, true);
            set(palette::paper());
            cairo_set_line_width(cr(), text.halo);
            cairo_set_dash(cr(), nullptr, 0, 0.0);
            cairo_stroke(cr());
        }
        set(text.colour);
        show(text, false);
        cairo_restore(cr());
    }

    /// Glyphs of one file and size at a time: as outlines, or as text that can be searched.
    void show(const Text& text, bool as_outline) {
        if (as_outline) cairo_new_path(cr());
        std::string letters;
        for (const Run& run : text.runs) letters += run.text;
        const auto placed = fonts_.glyphs(text.runs);
        std::size_t letter = 0;
        for (std::size_t first = 0; first < placed.size();) {
            std::size_t last = first;
            std::size_t n_bytes = 0;
            std::vector<cairo_glyph_t> glyphs;
            std::vector<cairo_text_cluster_t> clusters;
            for (; last < placed.size() && placed[last].file == placed[first].file &&
                   placed[last].scale == placed[first].scale;
                 ++last) {
                const PlacedGlyph& one = placed[last];
                glyphs.push_back({one.index, one.x * text.size, -one.rise * text.size});
                clusters.push_back({static_cast<int>(one.bytes), 1});
                n_bytes += one.bytes;
            }
            cairo_set_font_face(cr(), faces_[placed[first].file].get());
            cairo_set_font_size(cr(), text.size * placed[first].scale);
            const int n = static_cast<int>(glyphs.size());
            if (as_outline)
                cairo_glyph_path(cr(), glyphs.data(), n);
            else
                cairo_show_text_glyphs(cr(),
                                       letters.data() + letter,
                                       static_cast<int>(n_bytes),
                                       glyphs.data(),
                                       n,
                                       clusters.data(),
                                       n,
                                       cairo_text_cluster_flags_t{});
            letter += n_bytes;
            first = last;
        }
    }

    void draw(const Image& image) {
        const Surface surface = surface_of(*image.raster);
        cairo_save(cr());
        cairo_translate(cr(), image.box.left, image.box.top);
        cairo_scale(cr(),
                    image.box.width() / image.raster->width,
                    image.box.height() / image.raster->height);
        cairo_set_source_surface(cr(), surface.get(), 0.0, 0.0);
        cairo_pattern_set_filter(cairo_get_source(cr()), CAIRO_FILTER_BILINEAR);
        cairo_paint(cr());
        cairo_restore(cr());
    }

    void draw(const Clip& clip) {
        cairo_save(cr());
        trace({clip.edge});
        cairo_clip(cr());
        for (const auto& item : clip.content)
            std::visit([&](const auto& one) { draw(one); }, item);
        cairo_restore(cr());
    }

    std::unique_ptr<cairo_t, Destroy> context_;
    const Fonts& fonts_;
    std::vector<FontFace> faces_;
};

}  // namespace

std::string drawing_library_versions() {
    return std::string("Cairo ") + cairo_version_string() + ", FreeType " +
           Fonts::library_version();
}

std::string to_pdf(const Drawing& drawing, const Fonts& fonts, const std::string& title) {
    std::string bytes;
    const Surface surface(
        cairo_pdf_surface_create_for_stream(append, &bytes, drawing.width, drawing.height));
    check(cairo_surface_status(surface.get()));
    cairo_pdf_surface_set_metadata(
        surface.get(), CAIRO_PDF_METADATA_TITLE, printable(title).c_str());
    cairo_pdf_surface_set_metadata(surface.get(), CAIRO_PDF_METADATA_CREATOR, "deviascope");
    // The day of writing would change the bytes.
    cairo_pdf_surface_set_metadata(
        surface.get(), CAIRO_PDF_METADATA_CREATE_DATE, "2000-01-01T00:00:00Z");
    CairoWriter(surface.get(), fonts).page(drawing);
    cairo_surface_finish(surface.get());
    check(cairo_surface_status(surface.get()));
    return bytes;
}

std::string to_png(const Drawing& drawing, const Fonts& fonts, double dots_per_inch) {
    const double scale = dots_per_inch / 72.0;
    const Surface surface(
        cairo_image_surface_create(CAIRO_FORMAT_RGB24,
                                   static_cast<int>(std::ceil(drawing.width * scale)),
                                   static_cast<int>(std::ceil(drawing.height * scale))));
    check(cairo_surface_status(surface.get()));
    CairoWriter writer(surface.get(), fonts);
    writer.fill_page(palette::paper());
    writer.scale(scale);
    writer.page(drawing);
    return png_of(surface.get());
}

std::string to_png(const Raster& raster) {
    return png_of(surface_of(raster).get());
}

}  // namespace deviascope
