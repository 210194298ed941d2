#pragma once
// Cairo surfaces that write into memory.

#include <cairo.h>

#include <memory>
#include <string>

#include "ringwright/figures.hpp"

namespace ringwright::drawing {

struct DestroySurface {
    void operator()(cairo_surface_t* surface) const { cairo_surface_destroy(surface); }
};
using Surface = std::unique_ptr<cairo_surface_t, DestroySurface>;

/// The surface writes to `bytes`, which must outlive it. Sizes in points.
[[nodiscard]] Surface svg_surface(std::string& bytes, double width, double height);
/// A PDF without a date, so that the same pages give the same bytes.
[[nodiscard]] Surface pdf_surface(std::string& bytes, double width, double height);
/// SVG of a figure with its text as text, `background` painted first. Size and margin as in FigureSize, whose
/// height is given.
[[nodiscard]] std::string figure_svg(const Figure& figure, const FigureSize& size, bool background);
/// The size with its height chosen where it is 0.
[[nodiscard]] FigureSize with_height(const Figure& figure, FigureSize size);
/// Completes what the surface writes; throws OutputError where Cairo reports a fault.
void finish(const Surface& surface);
[[nodiscard]] std::string png_bytes(const Surface& image);

}  // namespace ringwright::drawing
