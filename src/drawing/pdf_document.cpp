// The report as PDF: blocks set one below the other, pages broken between them, laid out twice so that each
// page knows how many there are.

#include <cairo-pdf.h>
#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <numeric>

#include "drawing/canvas.hpp"
#include "drawing/document.hpp"
#include "drawing/fonts.hpp"
#include "drawing/kinds.hpp"
#include "drawing/surface.hpp"

namespace ringwright::drawing {
namespace {

struct PageGeometry {
    double width, height;
    double side = 56.0, top = 50.0, bottom = 54.0;
    [[nodiscard]] double text_width() const { return width - 2.0 * side; }
    [[nodiscard]] double floor() const { return height - bottom; }
};

PageGeometry geometry_of(PaperSize paper) {
    // ISO 216 and ANSI/ASME Y14.1 in points.
    return paper == PaperSize::a4 ? PageGeometry{595.276, 841.89} : PageGeometry{612.0, 792.0};
}

constexpr double body_size = 9.5, fine_size = 8.2, table_size = 8.5;
constexpr Colour good{26, 107, 60}, bad{160, 28, 40}, undecided{138, 90, 0}, tile_ground{246, 248, 250};

struct Style {
    double size = body_size;
    bool bold = false;
    Colour colour = palette::ink;
    PangoAlignment alignment = PANGO_ALIGN_LEFT;
};

Colour colour_of(const std::string& word) {
    if (word == "conforms") return good;
    if (word == "does_not_conform" || word == "defect") return bad;
    if (word == "undecided" || word == "caution") return undecided;
    return palette::frame;
}

void set_source(cairo_t* cairo, Colour colour) {
    cairo_set_source_rgb(cairo, colour.red / 255.0, colour.green / 255.0, colour.blue / 255.0);
}

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
    [[nodiscard]] Layout laid_out(const std::string& text, double width, const Style& style) const;
    [[nodiscard]] double height_of_text(const std::string& text, double width, const Style& style) const;
    /// Draws text with its top at y and returns its height.
    double text_at(const std::string& text, double x, double y, double width, const Style& style);
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

Layout PageWriter::laid_out(const std::string& text, double width, const Style& style) const {
    Layout layout = make_layout(cairo_, text, style.size, style.bold);
    pango_layout_set_width(layout.get(), static_cast<int>(width * PANGO_SCALE));
    pango_layout_set_wrap(layout.get(), PANGO_WRAP_WORD_CHAR);
    pango_layout_set_alignment(layout.get(), style.alignment);
    pango_layout_set_line_spacing(layout.get(), 1.12F);
    return layout;
}

double PageWriter::height_of_text(const std::string& text, double width, const Style& style) const {
    const Layout layout = laid_out(text, width, style);
    PangoRectangle logical{};
    pango_layout_get_extents(layout.get(), nullptr, &logical);
    return static_cast<double>(logical.height) / PANGO_SCALE;
}

double PageWriter::text_at(const std::string& text, double x, double y, double width, const Style& style) {
    const Layout layout = laid_out(text, width, style);
    PangoRectangle logical{};
    pango_layout_get_extents(layout.get(), nullptr, &logical);
    set_source(cairo_, style.colour);
    cairo_move_to(cairo_, x, y);
    pango_cairo_show_layout(cairo_, layout.get());
    return static_cast<double>(logical.height) / PANGO_SCALE;
}

void PageWriter::rule(double y, Colour colour, double width) {
    set_source(cairo_, colour);
    cairo_set_line_width(cairo_, width);
    cairo_move_to(cairo_, geometry_.side, y);
    cairo_line_to(cairo_, geometry_.width - geometry_.side, y);
    cairo_stroke(cairo_);
}

void PageWriter::finish_page() {
    const double y = geometry_.height - 36.0, half = 0.5 * geometry_.text_width();
    const Style left{fine_size, false, palette::muted, PANGO_ALIGN_LEFT};
    const Style right{fine_size, false, palette::muted, PANGO_ALIGN_RIGHT};
    rule(y - 5.0, palette::grid, 0.7);
    text_at(document_.kind + " " + document_.number, geometry_.side, y, half, left);
    text_at(fmt::format("page {} of {}", page_, page_count_), geometry_.side + half, y, half, right);
    cairo_show_page(cairo_);
}

void PageWriter::next_page() {
    finish_page();
    ++page_;
    y_ = geometry_.top;
}

void PageWriter::title() {
    y_ += text_at(document_.kind + " " + document_.number, geometry_.side, y_, geometry_.text_width(),
                  {fine_size, false, palette::muted, PANGO_ALIGN_LEFT});
    y_ += 2.0 + text_at(document_.title, geometry_.side, y_ + 1.0, geometry_.text_width(),
                        {19.0, true, palette::ink, PANGO_ALIGN_LEFT});
    y_ += 6.0;
    rule(y_, palette::ink, 1.0);
    y_ += 8.0;
}

void PageWriter::write() {
    title();
    for (const Block& block : document_.blocks) std::visit(*this, block);
    finish_page();
}

void PageWriter::operator()(const Heading& heading) {
    const bool part = heading.level == 2;
    const Style style{part ? 13.0 : 10.5, true, palette::ink, PANGO_ALIGN_LEFT};
    const double above = y_ > geometry_.top ? (part ? 16.0 : 10.0) : 0.0;
    const double height = height_of_text(heading.text, geometry_.text_width(), style);
    ensure(above + height + (part ? 90.0 : 70.0));
    if (y_ > geometry_.top) y_ += above;
    cairo_pdf_surface_add_outline(
        surface_, CAIRO_PDF_OUTLINE_ROOT, clean_utf8(heading.text).c_str(),
        fmt::format("page={} pos=[{:.1f} {:.1f}]", page_, geometry_.side, y_).c_str(),
        CAIRO_PDF_OUTLINE_FLAG_OPEN);
    y_ += text_at(heading.text, geometry_.side, y_, geometry_.text_width(), style) + (part ? 5.0 : 3.0);
}

void PageWriter::operator()(const Paragraph& paragraph) {
    const Style style{paragraph.fine ? fine_size : body_size, false,
                      paragraph.fine ? palette::muted : palette::ink, PANGO_ALIGN_LEFT};
    const double height = height_of_text(paragraph.text, geometry_.text_width(), style);
    ensure(height);
    y_ += text_at(paragraph.text, geometry_.side, y_, geometry_.text_width(), style) + 4.0;
}

void PageWriter::tiles(const std::vector<Tile>& tiles) {
    const double gap = 8.0, inset = 8.0, count = static_cast<double>(tiles.size());
    const double width = (geometry_.text_width() - (count - 1.0) * gap) / count, inner = width - 2.0 * inset;
    const Style name{fine_size, false, palette::muted, PANGO_ALIGN_LEFT},
        value{13.5, true, palette::ink, PANGO_ALIGN_LEFT};
    double height = 0.0;
    for (const Tile& tile : tiles)
        height = std::max(height, height_of_text(tile.name, inner, name) +
                                      height_of_text(tile.value, inner, value) +
                                      height_of_text(tile.note, inner, name) + 2.0 * inset);
    ensure(height);
    double x = geometry_.side;
    for (const Tile& tile : tiles) {
        cairo_rectangle(cairo_, x, y_, width, height);
        set_source(cairo_, tile_ground);
        cairo_fill_preserve(cairo_);
        set_source(cairo_, palette::grid);
        cairo_set_line_width(cairo_, 0.7);
        cairo_stroke(cairo_);
        double y = y_ + inset;
        y += text_at(tile.name, x + inset, y, inner, name);
        y += text_at(tile.value, x + inset, y, inner, value);
        text_at(tile.note, x + inset, y, inner, name);
        x += width + gap;
    }
    y_ += height + 10.0;
}

void PageWriter::operator()(const Answer& answer) {
    y_ += 4.0;
    if (!answer.headline.empty()) {
        const Style style{17.0, true, answer.verdict.empty() ? palette::ink : colour_of(answer.verdict),
                          PANGO_ALIGN_LEFT};
        const double inset = 12.0, width = geometry_.text_width() - inset;
        const double height = height_of_text(answer.headline, width, style);
        ensure(height + 24.0);
        set_source(cairo_, style.colour);
        cairo_rectangle(cairo_, geometry_.side, y_, 4.0, height);
        cairo_fill(cairo_);
        y_ += text_at(answer.headline, geometry_.side + inset, y_, width, style) + 3.0;
    }
    if (!answer.reading.empty())
        y_ += text_at(answer.reading, geometry_.side, y_, geometry_.text_width(), {}) + 6.0;
    if (!answer.tiles.empty()) tiles(answer.tiles);
}

void PageWriter::facts_in_columns(const Facts& facts, std::size_t columns) {
    const double gap = 16.0, count = static_cast<double>(columns);
    const double width = (geometry_.text_width() - (count - 1.0) * gap) / count;
    const double name_width = columns == 1 ? 104.0 : 78.0, value_width = width - name_width - 6.0;
    const Style name{9.0, false, palette::muted, PANGO_ALIGN_LEFT},
        value{9.0, false, palette::ink, PANGO_ALIGN_LEFT};
    for (std::size_t i = 0; i < facts.rows.size(); i += columns) {
        double height = 0.0;
        const std::size_t end = std::min(i + columns, facts.rows.size());
        for (std::size_t k = i; k < end; ++k)
            height = std::max(height, height_of_text(facts.rows[k].second, value_width, value));
        ensure(height);
        for (std::size_t k = i; k < end; ++k) {
            const double x = geometry_.side + static_cast<double>(k - i) * (width + gap);
            text_at(facts.rows[k].first, x, y_, name_width, name);
            text_at(facts.rows[k].second, x + name_width + 6.0, y_, value_width, value);
        }
        y_ += height + 2.0;
    }
    y_ += 5.0;
}

void PageWriter::operator()(const Facts& facts) {
    facts_in_columns(facts, facts.brief ? 2 : 1);
}

/// What each column would take on one line; where that is too much, the widest give way.
std::vector<double> PageWriter::column_widths(const Table& table) const {
    constexpr double gap = 10.0;
    std::vector<double> wanted(table.header.size(), 30.0), least(table.header.size(), 30.0);
    const auto measure = [&](const std::vector<std::string>& cells, bool header) {
        for (std::size_t i = 0; i < std::min(cells.size(), wanted.size()); ++i) {
            const double width = width_of(make_layout(cairo_, cells[i], table_size, header)) + gap;
            wanted[i] = std::max(wanted[i], header ? std::min(width, 62.0) : width);
            if (i < table.numeric.size() && table.numeric[i] && !header) least[i] = std::max(least[i], width);
        }
    };
    measure(table.header, true);
    for (const auto& cells : table.rows) measure(cells, false);
    const double room = geometry_.text_width() + gap;
    double total = std::accumulate(wanted.begin(), wanted.end(), 0.0);
    while (total > room) {
        const auto widest = std::ranges::max_element(wanted);
        const double taken = std::min(total - room, std::max(1.0, 0.1 * *widest));
        *widest -= taken;
        total -= taken;
    }
    // What is left over goes to the columns in equal parts, so that a table fills its page.
    for (double& width : wanted) width += (room - total) / static_cast<double>(wanted.size());
    return wanted;
}

double PageWriter::row_height(const std::vector<std::string>& cells, const std::vector<double>& widths,
                              bool bold) const {
    double height = 0.0;
    for (std::size_t i = 0; i < std::min(cells.size(), widths.size()); ++i)
        height = std::max(height, height_of_text(cells[i], widths[i] - 10.0,
                                                 {table_size, bold, palette::ink, PANGO_ALIGN_LEFT}));
    return height;
}

void PageWriter::table_row(const std::vector<std::string>& cells, const Table& table,
                           const std::vector<double>& widths, bool header) {
    const double height = row_height(cells, widths, header);
    double x = geometry_.side;
    for (std::size_t i = 0; i < std::min(cells.size(), widths.size()); ++i) {
        const bool numeric = i < table.numeric.size() && table.numeric[i];
        text_at(cells[i], x, y_ + 2.5, widths[i] - 10.0,
                {table_size, header, header ? palette::muted : palette::ink,
                 numeric ? PANGO_ALIGN_RIGHT : PANGO_ALIGN_LEFT});
        x += widths[i];
    }
    y_ += height + 5.0;
    rule(y_, header ? palette::frame : palette::grid, 0.6);
}

void PageWriter::operator()(const Table& table) {
    const std::vector<double> widths = column_widths(table);
    const double head = row_height(table.header, widths, true) + 5.0;
    ensure(head + 20.0);
    table_row(table.header, table, widths, true);
    for (const auto& cells : table.rows) {
        if (y_ + row_height(cells, widths, false) + 5.0 > geometry_.floor()) {
            next_page();
            table_row(table.header, table, widths, true);
        }
        table_row(cells, table, widths, false);
    }
    y_ += 6.0;
}

void PageWriter::figure_at(const NamedFigure& figure, double x, double y, const FigureSize& size) {
    const cairo_rectangle_t extents{0.0, 0.0, size.width, size.height};
    const Surface record(cairo_recording_surface_create(CAIRO_CONTENT_COLOR_ALPHA, &extents));
    {
        Canvas canvas(record.get(), size.width, size.height, size.font);
        draw(canvas, figure.figure);
    }
    cairo_save(cairo_);
    cairo_set_source_surface(cairo_, record.get(), x, y);
    cairo_rectangle(cairo_, x, y, size.width, size.height);
    cairo_fill(cairo_);
    cairo_restore(cairo_);
}

void PageWriter::operator()(const Pictures& pictures) {
    const std::string& first = pictures.figures.front().name;
    const bool small = first.starts_with("decrement") || first.starts_with("spectrum") ||
                       first.starts_with("autocorrelation") || first.starts_with("course");
    const bool beside = small || pictures.figures.size() > 1;
    const Style caption{fine_size, false, palette::muted, PANGO_ALIGN_LEFT};
    const auto words = [](const NamedFigure& figure) { return figure.title + ". " + figure.caption; };
    double height = 0.0;
    for (const NamedFigure& figure : pictures.figures) {
        const FigureSize size = page_figure_size(figure, beside, geometry_.text_width());
        height = std::max(height, size.height + 4.0 + height_of_text(words(figure), size.width, caption));
    }
    ensure(height + 6.0);
    double x = geometry_.side;
    for (const NamedFigure& figure : pictures.figures) {
        const FigureSize size = page_figure_size(figure, beside, geometry_.text_width());
        figure_at(figure, x, y_ + 4.0, size);
        text_at(words(figure), x, y_ + size.height + 7.0, size.width, caption);
        x += size.width + 14.0;
    }
    y_ += height + 12.0;
}

void PageWriter::operator()(const Notes& notes) {
    const double inset = 10.0, width = geometry_.text_width() - inset;
    for (const Note& note : notes.notes) {
        const std::string text = note.severity + " · " + note.text;
        const Style style{9.0, false, palette::ink, PANGO_ALIGN_LEFT};
        const double height = height_of_text(text, width, style);
        ensure(height);
        set_source(cairo_, colour_of(note.severity));
        cairo_rectangle(cairo_, geometry_.side, y_, 2.2, height);
        cairo_fill(cairo_);
        text_at(text, geometry_.side + inset, y_, width, style);
        y_ += height + 5.0;
    }
}

void PageWriter::operator()(const SignatureLines&) {
    ensure(86.0);
    y_ += 52.0;
    const double gap = 22.0, width = (geometry_.text_width() - 2.0 * gap) / 3.0;
    double x = geometry_.side;
    for (const char* name : {"Remarks", "Date", "Name and signature"}) {
        set_source(cairo_, palette::ink);
        cairo_set_line_width(cairo_, 0.7);
        cairo_move_to(cairo_, x, y_);
        cairo_line_to(cairo_, x + width, y_);
        cairo_stroke(cairo_);
        text_at(name, x, y_ + 3.0, width, {fine_size, false, palette::muted, PANGO_ALIGN_LEFT});
        x += width + gap;
    }
    y_ += 24.0;
}

int write_pages(std::string& bytes, const Document& document, const PageGeometry& geometry, int page_count) {
    const Surface surface = pdf_surface(bytes, geometry.width, geometry.height);
    const auto set = [&](cairo_pdf_metadata_t kind, const std::string& text) {
        if (!text.empty()) cairo_pdf_surface_set_metadata(surface.get(), kind, clean_utf8(text).c_str());
    };
    set(CAIRO_PDF_METADATA_TITLE,
        document.subject.empty() ? document.title : document.title + ": " + document.subject);
    set(CAIRO_PDF_METADATA_SUBJECT, "Test report " + document.number);
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
