#include "recording/csv_thousands.hpp"

#include <algorithm>
#include <array>
#include <string>
#include <vector>

#include "recording/in_pieces.hpp"
#include "recording/input_bytes.hpp"
#include "ringwright/each_index.hpp"

namespace ringwright {
namespace {

bool digits_and_marks(std::string_view cell, const Dialect& dialect) {
    const auto fits = [&](char c) {
        return (c >= '0' && c <= '9') || c == dialect.decimal || c == dialect.grouping || c == '-' ||
               c == '+';
    };
    return std::all_of(cell.begin(), cell.end(), fits);
}

// What stands in a line that may hold the mark. With commas between the columns a comma in a number stands in
// quotes.
char sign_of(char mark, const Dialect& plain) {
    return mark == plain.delimiter ? '"' : mark;
}

// Goes through the lines that hold the mark and looks at the cells that are no numbers without it.
class MarkCounter {
  public:
    MarkCounter(std::string_view rows, const Table& table, char mark)
        : rows_(rows), table_(table), plain_(table.dialect), grouped_(table.dialect) {
        grouped_.grouping = mark;
        found_.mark = mark;
    }

    ThousandsMarks count() {
        const char sought = sign_of(grouped_.grouping, plain_);
        std::size_t line_number = 0, counted_to = 0;
        for (std::size_t at = 0; (at = rows_.find(sought, at)) != std::string_view::npos;) {
            const std::size_t before = rows_.substr(0, at).rfind(table_.end_of_line);
            const std::size_t begin = before == std::string_view::npos ? 0 : before + 1;
            const std::size_t end = std::min(rows_.find(table_.end_of_line, at), rows_.size());
            line_number += static_cast<std::size_t>(
                std::count(rows_.begin() + static_cast<std::ptrdiff_t>(counted_to),
                           rows_.begin() + static_cast<std::ptrdiff_t>(begin), table_.end_of_line));
            was_read(rows_.substr(counted_to, begin - counted_to));
            counted_to = begin;
            count_line(rows_.substr(begin, end - begin), line_number);
            at = end;
        }
        return std::move(found_);
    }

  private:
    void count_line(std::string_view line, std::size_t number) {
        if (line.size() > (std::size_t{1} << 20)) return;
        split_cells(line, plain_.delimiter, cells_);
        for (std::size_t i = 0; i < std::min(cells_.size(), table_.columns.size()); ++i) {
            const std::string_view cell = cells_[i];
            if (table_.columns[i].content != ColumnContent::number || number_in_cell(cell, plain_)) continue;
            if (cell.find(grouped_.grouping) == std::string_view::npos) continue;
            if (number_in_cell(cell, grouped_)) {
                if (found_.grouped++ == 0) found_.grouped_line = number, found_.grouped_text = cell;
                if (cell.find(plain_.decimal) != std::string_view::npos) found_.decimal_mark_seen = true;
            } else if (digits_and_marks(cell, grouped_)) {
                if (found_.misplaced++ == 0) found_.misplaced_line = number, found_.misplaced_text = cell;
            }
        }
    }

    std::string_view rows_;
    const Table& table_;
    Dialect plain_, grouped_;
    std::vector<std::string_view> cells_;
    ThousandsMarks found_;
};

// Whether numbers in the first rows have the decimal mark of the dialect.
bool decimals_at_the_start(std::string_view rows, const Table& table) {
    constexpr std::size_t first_rows = 200;
    LineReader reader(rows, table.end_of_line);
    std::string_view line;
    std::vector<std::string_view> cells;
    for (std::size_t row = 0; row < first_rows && reader.next(line); ++row) {
        split_cells(line, table.dialect.delimiter, cells);
        for (const std::string_view cell : cells)
            if (cell.find(table.dialect.decimal) != std::string_view::npos &&
                number_in_cell(cell, table.dialect))
                return true;
    }
    return false;
}

}  // namespace

ThousandsMarks find_thousands_marks(std::string_view rows, const Table& table) {
    const std::array<char, 3> marks = {table.dialect.decimal == ',' ? '.' : ',', '\'', ' '};
    std::string signs;
    for (const char mark : marks) signs += sign_of(mark, table.dialect);
    const std::string present = bytes_present(rows, signs, threads_for(0));
    for (const char mark : marks) {
        if (present.find(sign_of(mark, table.dialect)) == std::string::npos) continue;
        if (table.dialect.grouping != '\0' || (mark == ' ' && table.dialect.delimiter == ' ')) continue;
        ThousandsMarks found = MarkCounter(rows, table, mark).count();
        if (found.grouped == 0) continue;
        const bool never_a_decimal = mark == ' ' || mark == '\'';
        if (!found.decimal_mark_seen)
            found.decimal_mark_seen = never_a_decimal || decimals_at_the_start(rows, table);
        return found;
    }
    return {};
}

}  // namespace ringwright
