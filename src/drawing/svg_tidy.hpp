#pragma once
// Cairo's SVG made small and repeatable, and fit for a page that holds several.

#include <string>
#include <vector>

#include "drawing/canvas.hpp"

namespace ringwright::drawing {

/// Rounds coordinates to hundredths of a point, drops attributes that say what SVG assumes anyway, and
/// renumbers Cairo's group names, which count up through the life of a process.
[[nodiscard]] std::string tidy_svg(const std::string& svg);

/// A picture with lines of text added on top, each moved by `offset`.
[[nodiscard]] std::string with_text(const std::string& svg, const std::vector<WrittenText>& texts,
                                    Point offset);

/// A tidy picture made fit for an HTML page: without XML declaration, every id prefixed so that two pictures
/// on a page do not share any, colours of the palette replaced by CSS properties (with the light colour to
/// fall back to), sized by its container, with a name for those who cannot see it.
[[nodiscard]] std::string inline_svg(const std::string& svg, const std::string& id_prefix,
                                     const std::string& name);

/// `text` with the five characters of XML escaped and control characters removed.
[[nodiscard]] std::string escaped(const std::string& text);

}  // namespace ringwright::drawing
