#pragma once
// Marks before the thousands that first stand far down in a table.

#include <cstddef>
#include <string>
#include <string_view>

#include "recording/csv_table.hpp"

namespace ringwright {

/// What the rows say of a mark before the thousands.
struct ThousandsMarks {
    char mark = '\0';                ///< '.', ',', ' ' or '\''; 0 where no number needs one
    std::size_t grouped = 0;         ///< cells that are numbers only with the mark taken out ("1.167,48")
    std::size_t misplaced = 0;       ///< cells of digits with the mark before another count than three
    bool decimal_mark_seen = false;  ///< beside the mark, or in other numbers of the table
    std::size_t grouped_line = 0;    ///< of the first, from 0 at the start of the rows
    std::size_t misplaced_line = 0;  ///< likewise
    std::string grouped_text, misplaced_text;  ///< the first of each

    /// Whether the mark can be taken out: in groups of three wherever it stands (one cell in a hundred may be
    /// damaged), and no decimal mark itself.
    [[nodiscard]] bool consistent() const {
        return grouped > 0 && decimal_mark_seen && misplaced * 100 <= grouped;
    }
};

/// Searches all `rows` for numbers that the dialect of the table, which groups no thousands, cannot read.
[[nodiscard]] ThousandsMarks find_thousands_marks(std::string_view rows, const Table& table);

}  // namespace ringwright
