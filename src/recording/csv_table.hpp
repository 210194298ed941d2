#pragma once
// Where the table stands in a text file, how it is written, and what its columns hold.

#include <cstddef>
#include <optional>
#include <string>
#include <string_view>
#include <vector>

#include "recording/csv_cells.hpp"
#include "ringwright/units.hpp"

namespace ringwright {

/// Steps through lines that end in LF, CRLF or CR.
class LineReader {
  public:
    explicit LineReader(std::string_view text);
    LineReader(std::string_view text, char end_of_line) : rest_(text), end_of_line_(end_of_line) {}
    /// False at the end of the text.
    bool next(std::string_view& line);
    /// Where the next line begins, in the text given.
    [[nodiscard]] std::size_t offset() const { return offset_; }
    [[nodiscard]] char end_of_line() const { return end_of_line_; }

  private:
    std::string_view rest_;
    char end_of_line_;
    std::size_t offset_ = 0;
};

/// A longer row is a recording laid on its side, or damage.
inline constexpr std::size_t most_columns = 4096;

enum class CellKind { number, stamp, missing, text };
[[nodiscard]] CellKind kind_of_cell(std::string_view cell, const Dialect& dialect);

/// What stands in a column, from a sample of its rows.
enum class ColumnContent { number, stamp, text, empty };

struct Column {
    std::string name;  ///< of the header; may be empty
    std::string unit_text;
    std::optional<Unit> unit;
    ColumnContent content = ColumnContent::empty;
};

struct Table {
    Dialect dialect;
    char end_of_line = '\n';
    std::size_t begin = 0;       ///< of the first row of data, in the text
    std::size_t first_line = 1;  ///< its line number
    std::size_t preamble_lines = 0;
    std::size_t header_lines = 0;
    std::vector<Column> columns;
    std::string_view preamble;          ///< all text before the data
    bool thousands_or_decimal = false;  ///< every comma in a number could also group thousands
    bool comma_could_be_decimal =
        false;  ///< a pair of whole-number columns could be one decimal-comma column
};

/// What the options say of the columns, which helps where the text can be read in two ways.
struct TableHints {
    std::size_t least_columns = 0;
};

/// Finds the first row after which rows of numbers follow one another in the same form. Nothing when there is
/// no such place.
[[nodiscard]] std::optional<Table> find_table(std::string_view text, bool latin1,
                                              const TableHints& hints = {});

}  // namespace ringwright
