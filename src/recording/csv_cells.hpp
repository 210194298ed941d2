#pragma once
// One cell of a table as loggers write it: numbers, marks for what is missing, dates and clock times.

#include <cstdint>
#include <optional>
#include <string_view>
#include <vector>

namespace ringwright {

/// How the cells of a table are written. A delimiter of ' ' stands for any run of blanks and tabs.
struct Dialect {
    char delimiter = ',';
    char decimal = '.';
    char grouping = '\0';  ///< of thousands: ',', '.', ' ' or '\''; 0 for none
};

/// Splits a line into trimmed cells, quotes taken off. A trailing delimiter gives an empty last cell.
void split_cells(std::string_view line, char delimiter, std::vector<std::string_view>& cells);

[[nodiscard]] std::string_view trimmed_cell(std::string_view cell);

/// The number that is the whole cell, finite; nothing otherwise.
[[nodiscard]] std::optional<double> number_in_cell(std::string_view cell, const Dialect& dialect);

/// What a cell without a number means.
enum class Absence { empty, not_a_number, overflow, text };
/// Tells empty cells, NaN marks and overflow marks ("OVER", "OL", "####", "Inf", "1.#INF", "--") from text.
[[nodiscard]] Absence absence_of(std::string_view cell);

/// Meters write 9.9e37 for an overload (common practice, no source).
[[nodiscard]] constexpr bool is_overload(double value) {
    return value >= 9e37 || value <= -9e37;
}

/// A date, a clock time, or both. Nanoseconds: from 1970-01-01 where there is a date, else from midnight.
struct ClockStamp {
    std::int64_t nanoseconds = 0;
    bool has_date = false;
    bool has_time = false;
    int decimals = 0;             ///< of the seconds as written
    bool day_month_open = false;  ///< "03/04/2031": which is the month is not certain
};

/// ISO 8601 dates and times ("2031-04-02T10:15:30.250Z", "2031-04-02 10:15:30,250+02:00", "10:15:30.250"),
/// and the forms "02.04.2031 10:15:30,25" and "4/2/2031 10:15:30.25 AM". Nothing when the cell is none of
/// these.
[[nodiscard]] std::optional<ClockStamp> stamp_in_cell(std::string_view cell);

/// Places after the decimal mark of a number as it is written, exponent included: "1.250e-03" has 6.
[[nodiscard]] int decimals_in_cell(std::string_view cell, char decimal);

}  // namespace ringwright
