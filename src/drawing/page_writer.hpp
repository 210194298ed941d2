#pragma once
// The blocks of a document set one below the other on the pages of a PDF.

#include <string>
#include <vector>

#include "drawing/document.hpp"
#include "drawing/fonts.hpp"
#include "drawing/palette.hpp"

namespace ringwright::drawing {

/// Points.
struct PageGeometry {
    double width, height;
    double side = 56.0, top = 50.0, bottom = 54.0;
    [[nodiscard]] double text_width() const { return width - 2.0 * side; }
    [[nodiscard]] double floor() const { return height - bottom; }
};

constexpr double body_size = 9.5, fine_size = 8.2, table_size = 8.5;

/// How a stretch of text looks.
struct TextLook {
    double size = body_size;
    bool bold = false;
    Colour colour = palette::ink;
    PangoAlignment alignment = PANGO_ALIGN_LEFT;
    bool beside_name = false;  ///< begins at the left also where it runs from right to left
};

/// Sets the blocks of a document on the pages of a surface.
class PageWriter {
  public:
    PageWriter(cairo_surface_t* surface, const Document& document, const PageGeometry& geometry,
               int page_count)
        : surface_(surface),
          cairo_(cairo_create(surface)),
          document_(document),
          geometry_(geometry),
          page_count_(page_count),
          y_(geometry.top) {}
    ~PageWriter() { cairo_destroy(cairo_); }
    PageWriter(const PageWriter&) = delete;
    PageWriter& operator=(const PageWriter&) = delete;

    void write();
    [[nodiscard]] int pages() const { return page_; }

    void operator()(const Heading& heading);
    void operator()(const Paragraph& paragraph);
    void operator()(const Answer& answer);
    void operator()(const Facts& facts);
    void operator()(const Table& table);
    void operator()(const Pictures& pictures);
    void operator()(const Notes& notes);
    void operator()(const SignatureLines&);
    void operator()(const PageBreak&) {
        if (y_ > geometry_.top) next_page();
    }

  private:
    [[nodiscard]] Layout laid_out(const std::string& text, double width, const TextLook& style) const;
    [[nodiscard]] double height_of_text(const std::string& text, double width, const TextLook& style) const;
    /// Draws text with its top at y and returns its height.
    double text_at(const std::string& text, double x, double y, double width, const TextLook& style);
    void ensure(double height) {
        if (y_ + height > geometry_.floor() && y_ > geometry_.top) next_page();
    }
    void next_page();
    void finish_page();
    void rule(double y, Colour colour, double width);
    void title();
    void facts_in_columns(const Facts& facts, std::size_t columns);
    void tiles(const std::vector<Tile>& tiles);
    [[nodiscard]] std::vector<double> column_widths(const Table& table) const;
    [[nodiscard]] double row_height(const std::vector<std::string>& cells, const std::vector<double>& widths,
                                    bool bold) const;
    void table_row(const std::vector<std::string>& cells, const Table& table,
                   const std::vector<double>& widths, bool header);
    void figure_at(const NamedFigure& figure, double x, double y, const FigureSize& size);

    cairo_surface_t* surface_;
    cairo_t* cairo_;
    const Document& document_;
    PageGeometry geometry_;
    int page_count_, page_ = 1;
    double y_;
};

}  // namespace ringwright::drawing
