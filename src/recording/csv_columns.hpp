#pragma once
// Which column is the clock and which is the signal.

#include <string>
#include <string_view>
#include <vector>

#include "recording/csv_rows.hpp"
#include "recording/csv_table.hpp"
#include "ringwright/recording.hpp"

namespace ringwright {

/// Cells of rows from the beginning, the middle and the end of a table.
struct RowSample {
    std::vector<std::vector<std::string_view>> first, middle, last;
};
[[nodiscard]] RowSample sample_rows(std::string_view rows, const Table& table);

/// The clock's column and unit.
struct TimeChoice {
    TimeSource source = TimeSource::none;
    std::size_t column = 0;
    std::size_t date_column = 0;
    double seconds_per_unit = 1.0;
    double rounding_s = 0.0;  ///< step of the last digit written
    std::int64_t stamp_base_ns = 0;
    bool from_zero = false;               ///< counts since 1970 and clock times: the first row is time 0
    bool without_date = false;            ///< clock times that begin again at midnight
    std::vector<std::size_t> not_signal;  ///< columns that hold times or running numbers
    Findings findings;
};
/// Throws UsageError when `--time-column` names no column.
[[nodiscard]] TimeChoice choose_time(const Table& table, const RowSample& sample, const ReadOptions& options);

struct SignalChoice {
    std::size_t column = 0;
    Findings findings;
};
/// The column that the options name, else the only one, else the one that measures motion, else the one with
/// the clearest signal. Throws UsageError when `--channel` names no column, InputError when there is none.
[[nodiscard]] SignalChoice choose_signal(const Table& table, std::string_view rows, const TimeChoice& time,
                                         const ReadOptions& options, const std::string& file);

/// Name of a column for people: its header, or its 1-based number.
[[nodiscard]] std::string column_name(const Table& table, std::size_t column);

}  // namespace ringwright
