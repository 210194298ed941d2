#include "ringwright/figures.hpp"

#include <cairo.h>

#include <algorithm>
#include <cctype>
#include <cmath>

#include "drawing/kinds.hpp"
#include "drawing/surface.hpp"
#include "drawing/svg_tidy.hpp"

namespace ringwright {
namespace drawing {
namespace {

void draw_on(cairo_surface_t* surface, const Figure& figure, const FigureSize& size) {
    double x_scale = 1.0, y_scale = 1.0;
    cairo_surface_get_device_scale(surface, &x_scale, &y_scale);
    cairo_surface_set_device_offset(surface, size.margin * x_scale, size.margin * y_scale);
    Canvas canvas(surface, size.width, size.height, size.font);
    canvas.fill({-size.margin, -size.margin, size.width + 2.0 * size.margin, size.height + 2.0 * size.margin},
                palette::paper);
    draw(canvas, figure);
}

std::string draw_pdf(const Figure& figure, const FigureSize& size) {
    std::string bytes;
    const Surface surface =
        pdf_surface(bytes, size.width + 2.0 * size.margin, size.height + 2.0 * size.margin);
    draw_on(surface.get(), figure, size);
    finish(surface);
    return bytes;
}

std::string draw_png(const Figure& figure, const FigureSize& size) {
    const double scale = size.pixels_per_point;
    const auto pixels = [&](double points) {
        return static_cast<int>(std::ceil((points + 2.0 * size.margin) * scale));
    };
    const Surface surface(
        cairo_image_surface_create(CAIRO_FORMAT_RGB24, pixels(size.width), pixels(size.height)));
    cairo_surface_set_device_scale(surface.get(), scale, scale);
    draw_on(surface.get(), figure, size);
    return png_bytes(surface);
}

}  // namespace

std::string figure_svg(const Figure& figure, const FigureSize& size, bool background) {
    std::string bytes;
    std::vector<WrittenText> texts;
    {
        const Surface surface =
            svg_surface(bytes, size.width + 2.0 * size.margin, size.height + 2.0 * size.margin);
        cairo_surface_set_device_offset(surface.get(), size.margin, size.margin);
        Canvas canvas(surface.get(), size.width, size.height, size.font);
        canvas.collect_text();
        if (background)
            canvas.fill(
                {-size.margin, -size.margin, size.width + 2.0 * size.margin, size.height + 2.0 * size.margin},
                palette::paper);
        draw(canvas, figure);
        texts = canvas.collected();
        finish(surface);
    }
    return with_text(tidy_svg(bytes), texts, {size.margin, size.margin});
}

FigureSize with_height(const Figure& figure, FigureSize size) {
    if (!(size.height > 0.0)) size.height = std::ceil(height_of(figure, size));
    return size;
}

}  // namespace drawing

std::optional<ImageFormat> image_format_of(std::string_view file_name) {
    const std::size_t dot = file_name.rfind('.');
    if (dot == std::string_view::npos) return std::nullopt;
    std::string ending(file_name.substr(dot + 1));
    std::ranges::transform(ending, ending.begin(),
                           [](unsigned char letter) { return static_cast<char>(std::tolower(letter)); });
    if (ending == "svg") return ImageFormat::svg;
    if (ending == "pdf") return ImageFormat::pdf;
    if (ending == "png") return ImageFormat::png;
    return std::nullopt;
}

std::string draw_figure(const Figure& figure, ImageFormat format, const FigureSize& wanted) {
    const FigureSize size = drawing::with_height(figure, wanted);
    switch (format) {
        case ImageFormat::svg:
            return drawing::figure_svg(figure, size, true);
        case ImageFormat::pdf:
            return drawing::draw_pdf(figure, size);
        case ImageFormat::png:
            break;
    }
    return drawing::draw_png(figure, size);
}

}  // namespace ringwright
