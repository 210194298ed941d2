#pragma once
// Pango set up the same way wherever the project draws text.

#include <pango/pangocairo.h>

#include <memory>
#include <string>

namespace ringwright::drawing {

struct FreeObject {
    void operator()(void* object) const { g_object_unref(object); }
};
using Layout = std::unique_ptr<PangoLayout, FreeObject>;

/// The families in the order of preference; Pango takes the next one, and then any font of the system, for a
/// character that a family lacks.
inline constexpr const char* sans_families = "Liberation Sans, DejaVu Sans, sans-serif";
inline constexpr const char* mono_families = "Liberation Mono, DejaVu Sans Mono, monospace";

/// A layout whose point is one unit of the surface, without hinting, so that the same text has the same width
/// on every kind of surface. Bytes that are no UTF-8 are replaced.
[[nodiscard]] Layout make_layout(cairo_t* cairo, const std::string& text, double size, bool bold = false,
                                 const char* families = sans_families);

/// Text that is certainly UTF-8 without control characters other than line feeds.
[[nodiscard]] std::string clean_utf8(const std::string& text);

/// Width, and the height of the first baseline below the top, in the units of the surface.
[[nodiscard]] double width_of(const Layout& layout);
[[nodiscard]] double baseline_of(const Layout& layout);

/// Valid UTF-8 as characters, and back.
[[nodiscard]] std::u32string to_characters(const std::string& utf8);
[[nodiscard]] std::string to_utf8(const std::u32string& characters);

}  // namespace ringwright::drawing
