#include "drawing/surface.hpp"

#include <cairo-pdf.h>
#include <cairo-svg.h>

#include "ringwright/error.hpp"

namespace ringwright::drawing {
namespace {

cairo_status_t append(void* closure, const unsigned char* data, unsigned int length) {
    static_cast<std::string*>(closure)->append(reinterpret_cast<const char*>(data), length);
    return CAIRO_STATUS_SUCCESS;
}

void require_success(cairo_status_t status) {
    if (status != CAIRO_STATUS_SUCCESS)
        throw OutputError({"", "",
                           std::string("the picture cannot be drawn: ") + cairo_status_to_string(status),
                           "Ask for a smaller picture"});
}

}  // namespace

Surface svg_surface(std::string& bytes, double width, double height) {
    return Surface(cairo_svg_surface_create_for_stream(append, &bytes, width, height));
}

Surface pdf_surface(std::string& bytes, double width, double height) {
    Surface surface(cairo_pdf_surface_create_for_stream(append, &bytes, width, height));
    cairo_pdf_surface_set_metadata(surface.get(), CAIRO_PDF_METADATA_CREATE_DATE, nullptr);
    return surface;
}

void finish(const Surface& surface) {
    cairo_surface_finish(surface.get());
    require_success(cairo_surface_status(surface.get()));
}

std::string png_bytes(const Surface& image) {
    require_success(cairo_surface_status(image.get()));
    std::string bytes;
    require_success(cairo_surface_write_to_png_stream(image.get(), append, &bytes));
    return bytes;
}

}  // namespace ringwright::drawing
