#include "drawing/fonts.hpp"

namespace ringwright::drawing {
namespace {

void set_up_context(PangoLayout* layout) {
    PangoContext* context = pango_layout_get_context(layout);
    pango_cairo_context_set_resolution(context, 72.0);
    cairo_font_options_t* options = cairo_font_options_create();
    cairo_font_options_set_hint_style(options, CAIRO_HINT_STYLE_NONE);
    cairo_font_options_set_hint_metrics(options, CAIRO_HINT_METRICS_OFF);
    cairo_font_options_set_antialias(options, CAIRO_ANTIALIAS_GRAY);
    pango_cairo_context_set_font_options(context, options);
    cairo_font_options_destroy(options);
    pango_context_set_round_glyph_positions(context, FALSE);
    pango_layout_context_changed(layout);
}

}  // namespace

std::string clean_utf8(const std::string& text) {
    char* valid = g_utf8_make_valid(text.data(), static_cast<gssize>(text.size()));
    std::string clean;
    for (const char* at = valid; *at != '\0';) {
        const char* next = g_utf8_next_char(at);
        const bool control = g_unichar_iscntrl(g_utf8_get_char(at)) != 0 && *at != '\n';
        if (control)
            clean += ' ';
        else
            clean.append(at, static_cast<std::size_t>(next - at));
        at = next;
    }
    g_free(valid);
    return clean;
}

Layout make_layout(cairo_t* cairo, const std::string& text, double size, bool bold, const char* families) {
    Layout layout(pango_cairo_create_layout(cairo));
    set_up_context(layout.get());
    PangoFontDescription* font = pango_font_description_new();
    pango_font_description_set_family(font, families);
    pango_font_description_set_absolute_size(font, size * PANGO_SCALE);
    pango_font_description_set_weight(font, bold ? PANGO_WEIGHT_BOLD : PANGO_WEIGHT_NORMAL);
    pango_layout_set_font_description(layout.get(), font);
    pango_font_description_free(font);
    const std::string clean = clean_utf8(text);
    pango_layout_set_text(layout.get(), clean.data(), static_cast<int>(clean.size()));
    return layout;
}

double width_of(const Layout& layout) {
    PangoRectangle logical{};
    pango_layout_get_extents(layout.get(), nullptr, &logical);
    return static_cast<double>(logical.width) / PANGO_SCALE;
}

double baseline_of(const Layout& layout) {
    return static_cast<double>(pango_layout_get_baseline(layout.get())) / PANGO_SCALE;
}

std::u32string to_characters(const std::string& utf8) {
    std::u32string characters;
    for (const char* at = utf8.c_str(); *at != '\0'; at = g_utf8_next_char(at))
        characters += static_cast<char32_t>(g_utf8_get_char(at));
    return characters;
}

std::string to_utf8(const std::u32string& characters) {
    std::string utf8;
    char bytes[6];
    for (const char32_t character : characters)
        utf8.append(bytes, static_cast<std::size_t>(g_unichar_to_utf8(character, bytes)));
    return utf8;
}

}  // namespace ringwright::drawing
