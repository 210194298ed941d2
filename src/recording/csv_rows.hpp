#pragma once
// The rows of a table into columns of doubles, in one pass and without memory for each cell.

#include <cstddef>
#include <cstdint>
#include <functional>
#include <optional>
#include <string>
#include <string_view>
#include <vector>

#include "recording/csv_cells.hpp"
#include "ringwright/recording.hpp"

namespace ringwright {

/// Where the time of a row stands.
enum class TimeSource {
    none,
    number,        ///< a number in some unit of time
    stamp,         ///< a clock time, with or without date
    date_and_time  ///< a date in one column, a clock time in another
};

/// Which cells of a row are wanted.
struct RowPlan {
    Dialect dialect;
    char end_of_line = '\n';
    TimeSource time_source = TimeSource::none;
    std::size_t time_column = 0;
    std::size_t date_column = 0;
    std::size_t value_column = 0;
    std::int64_t stamp_base_ns = 0;  ///< subtracted from every stamp
};

/// What stood in a cell without a number, and the first line where that was so (counted from 0 at the start
/// of the rows).
struct Absences {
    std::size_t count = 0;
    std::size_t first_line = 0;
    void add(std::size_t line) {
        if (count++ == 0) first_line = line;
    }
    void merge(const Absences& later, std::size_t lines_before);
};

struct Rows {
    std::vector<double>
        times;  ///< numbers as written, stamps in s; NaN where not readable; empty without time
    std::vector<double> values;  ///< NaN where missing
    std::size_t lines = 0;
    Absences empty, not_a_number, overflow, text, unreadable_time;
    Absences unreadable_row;  ///< neither time nor value: left out of times and values
    std::string first_text;   ///< the first text found in place of a number
};

/// Reads the rows in `text`, on as many threads as `threads` (the answer does not depend on it). `progress`
/// is called with the share done, from the calling thread.
[[nodiscard]] Rows read_rows(std::string_view text, const RowPlan& plan, unsigned threads,
                             const std::function<void(double)>& progress = {});

/// Reads the rows of one piece of a text in place of what `rows` holds, in its memory.
void read_piece(std::string_view piece, const RowPlan& plan, Rows& rows);

/// Adds the counts of the rows behind.
void merge_counts(Rows& counts, const Rows& later);

/// Rows whose times are one steady clock, which stands in place of the times.
struct SteadyRows {
    Rows rows;
    SampleClock clock;
};

/// The same for a long text whose times are numbers in a unit of so many seconds, written to `rounding_s`,
/// without memory for the times. Nothing when the text is short or the clock is none that `clock_from_stamps`
/// takes for uniform.
[[nodiscard]] std::optional<SteadyRows> read_steady_rows(std::string_view text, const RowPlan& plan,
                                                         double seconds_per_unit, double rounding_s,
                                                         unsigned threads,
                                                         const std::function<void(double)>& progress = {});

}  // namespace ringwright
