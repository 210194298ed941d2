#pragma once
// What a piece of a text table says without its rows.

#include <cstddef>
#include <vector>

#include "recording/clock.hpp"
#include "recording/csv_rows.hpp"
#include "recording/signal_digest.hpp"

namespace ringwright {

/// How the times of the rows become seconds.
struct TimeScale {
    bool timed = false;
    bool without_date = false;
    bool number = false;
    double zero = 0.0;  ///< taken off, as written
    double seconds_per_unit = 1.0;
    double rounding_s = 0.0;
    double usual_s = 0.0;  ///< step between rows, about
};

/// Seconds, from midnight of the day of the first of them where the stamps have no date.
void to_seconds(std::vector<double>& times, const TimeScale& scale);

/// Places where time is lost.
struct LostTime {
    StepCourse steps;
    std::vector<std::size_t> before;  ///< each of these kept rows
};

/// Rows are kept that have a value.
struct CsvPiece {
    std::size_t begin = 0, end = 0;  ///< bytes, in the rows of the table
    std::size_t rows = 0, kept = 0;
    std::size_t row_begin = 0, kept_begin = 0;  ///< of all before it
    std::size_t leading = 0, trailing = 0;      ///< rows at either end that are not kept
    Rows absences;                              ///< the counts alone
    StampCourse course;                         ///< of all rows, in seconds
    StepCourse scatter;                         ///< of all rows' steps
    double first_s = 0.0, last_s = 0.0;         ///< of kept rows
    double last_raw_s = 0.0;                    ///< as the clock shows it, without the days that were added
    double median_step_s = 0.0;
    double days_s = 0.0;  ///< to add to its times
    LostTime by_row;      ///< in rows, from the first of the piece
    LostTime by_stamp;
    SignalDigest digest;
};

/// Fills all but the places; leaves the times in `rows` in seconds. Samples are values times `factor`.
void digest_rows(Rows& rows, const TimeScale& scale, double factor, CsvPiece& piece);

/// Moves its times.
void shift(CsvPiece& piece, double seconds);

}  // namespace ringwright
