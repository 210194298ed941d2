// Text, answers, facts, notes and figures on a page; tables are in page_table.cpp.

#include "drawing/page_writer.hpp"

#include <cairo-pdf.h>
#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "drawing/canvas.hpp"
#include "drawing/kinds.hpp"
#include "drawing/surface.hpp"

namespace ringwright::drawing {
namespace {

constexpr Colour good{26, 107, 60}, bad{160, 28, 40}, undecided{138, 90, 0}, tile_ground{246, 248, 250};

Colour colour_of(const std::string& word) {
    if (word == "conforms") return good;
    if (word == "does_not_conform" || word == "defect") return bad;
    if (word == "undecided" || word == "caution") return undecided;
    return palette::frame;
}

void set_source(cairo_t* cairo, Colour colour) {
    cairo_set_source_rgb(cairo, colour.red / 255.0, colour.green / 255.0, colour.blue / 255.0);
}

}  // namespace

Layout PageWriter::laid_out(const std::string& text, double width, const TextLook& style) const {
    Layout layout = make_layout(cairo_, text, style.size, style.bold);
    pango_layout_set_width(layout.get(), static_cast<int>(width * PANGO_SCALE));
    pango_layout_set_wrap(layout.get(), PANGO_WRAP_WORD_CHAR);
    // Pango takes left for right in a paragraph that runs from right to left.
    const bool turned =
        style.beside_name && pango_layout_get_direction(layout.get(), 0) == PANGO_DIRECTION_RTL;
    pango_layout_set_alignment(layout.get(), turned ? PANGO_ALIGN_RIGHT : style.alignment);
    pango_layout_set_line_spacing(layout.get(), 1.12F);
    return layout;
}

double PageWriter::height_of_text(const std::string& text, double width, const TextLook& style) const {
    const Layout layout = laid_out(text, width, style);
    PangoRectangle logical{};
    pango_layout_get_extents(layout.get(), nullptr, &logical);
    return static_cast<double>(logical.height) / PANGO_SCALE;
}

double PageWriter::text_at(const std::string& text, double x, double y, double width, const TextLook& style) {
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
    const TextLook left{fine_size, false, palette::muted, PANGO_ALIGN_LEFT};
    const TextLook right{fine_size, false, palette::muted, PANGO_ALIGN_RIGHT};
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
    const TextLook style{part ? 13.0 : 10.5, true, palette::ink, PANGO_ALIGN_LEFT};
    const double above = y_ > geometry_.top ? (part ? 16.0 : 10.0) : 0.0;
    const double height = height_of_text(heading.text, geometry_.text_width(), style);
    // A part begins with some of its text; the signature stands below what is signed.
    const double room = heading.together ? 170.0 : part ? 90.0 : 70.0;
    ensure(above + height + room);
    if (y_ > geometry_.top) y_ += above;
    cairo_pdf_surface_add_outline(
        surface_, CAIRO_PDF_OUTLINE_ROOT, clean_utf8(heading.text).c_str(),
        fmt::format("page={} pos=[{:.1f} {:.1f}]", page_, geometry_.side, y_).c_str(),
        CAIRO_PDF_OUTLINE_FLAG_OPEN);
    y_ += text_at(heading.text, geometry_.side, y_, geometry_.text_width(), style) + (part ? 5.0 : 3.0);
}

void PageWriter::operator()(const Paragraph& paragraph) {
    const TextLook style{paragraph.fine ? fine_size : body_size, false,
                         paragraph.fine ? palette::muted : palette::ink, PANGO_ALIGN_LEFT};
    const double height = height_of_text(paragraph.text, geometry_.text_width(), style);
    ensure(height);
    y_ += text_at(paragraph.text, geometry_.side, y_, geometry_.text_width(), style) + 4.0;
}

void PageWriter::tiles(const std::vector<Tile>& tiles) {
    const double gap = 8.0, inset = 8.0, count = static_cast<double>(tiles.size());
    const double width = (geometry_.text_width() - (count - 1.0) * gap) / count, inner = width - 2.0 * inset;
    const TextLook name{fine_size, false, palette::muted, PANGO_ALIGN_LEFT},
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
        const TextLook style{17.0, true, answer.verdict.empty() ? palette::ink : colour_of(answer.verdict),
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
    const TextLook name{9.0, false, palette::muted, PANGO_ALIGN_LEFT},
        value{9.0, false, palette::ink, PANGO_ALIGN_LEFT, true};
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

void PageWriter::figure_at(const NamedFigure& figure, double x, double y, const FigureSize& size) {
    if (page_count_ == 0) return;  // only the pages are counted
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
    const bool beside = set_beside(pictures);
    const TextLook caption{fine_size, false, palette::muted, PANGO_ALIGN_LEFT};
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
        const TextLook style{9.0, false, palette::ink, PANGO_ALIGN_LEFT};
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

}  // namespace ringwright::drawing
