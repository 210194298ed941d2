// The report as PDF, laid out twice so that each page knows how many there are.

#include <cairo-pdf.h>

#include "drawing/document.hpp"
#include "drawing/page_writer.hpp"
#include "drawing/surface.hpp"

namespace ringwright::drawing {
namespace {

PageGeometry geometry_of(PaperSize paper) {
    // ISO 216 and ANSI/ASME Y14.1 in points.
    return paper == PaperSize::a4 ? PageGeometry{595.276, 841.89} : PageGeometry{612.0, 792.0};
}

int write_pages(std::string& bytes, const Document& document, const PageGeometry& geometry, int page_count) {
    const Surface surface = pdf_surface(bytes, geometry.width, geometry.height);
    const auto set = [&](cairo_pdf_metadata_t kind, const std::string& text) {
        if (!text.empty()) cairo_pdf_surface_set_metadata(surface.get(), kind, clean_utf8(text).c_str());
    };
    set(CAIRO_PDF_METADATA_TITLE,
        document.subject.empty() ? document.title : document.title + ": " + document.subject);
    set(CAIRO_PDF_METADATA_SUBJECT, document.kind + " " + document.number);
    set(CAIRO_PDF_METADATA_CREATOR, document.creator);
    set(CAIRO_PDF_METADATA_CREATE_DATE, document.date);
    int pages = 0;
    {
        PageWriter writer(surface.get(), document, geometry, page_count);
        writer.write();
        pages = writer.pages();
    }
    finish(surface);
    return pages;
}

}  // namespace

std::string to_pdf(const Document& document, PaperSize paper) {
    const PageGeometry geometry = geometry_of(paper);
    std::string bytes;
    const int pages = write_pages(bytes, document, geometry, 0);
    bytes.clear();
    write_pages(bytes, document, geometry, pages);
    return bytes;
}

}  // namespace ringwright::drawing
