// Tables on a page: widths of columns, rows, and the header again on each page.

#include <algorithm>
#include <numeric>

#include "drawing/page_writer.hpp"

namespace ringwright::drawing {

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
    double height = head;
    for (const auto& cells : table.rows) height += row_height(cells, widths, false) + 5.0;
    // A short table stays in one piece.
    ensure(height < 0.25 * geometry_.height ? height : head + 20.0);
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

}  // namespace ringwright::drawing
