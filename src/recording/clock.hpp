#pragma once
// From time stamps as they were recorded to the clock of a recording.

#include <optional>
#include <string>
#include <vector>

#include "recording/stamp_course.hpp"
#include "ringwright/finding.hpp"
#include "ringwright/recording.hpp"

namespace ringwright {

struct Timed {
    std::vector<double> values;
    SampleClock clock;
    std::vector<SampleRange> gaps;
    Findings findings;
};

/// What the steps between samples say: where time was lost, and how the others scatter.
struct StepCourse {
    std::size_t gaps = 0, even = 0;  ///< steps that are gaps, and that are none
    double lost_s = 0.0, longest_s = 0.0, longest_at_s = 0.0;
    double scatter = 0.0;  ///< sum of squares of the even steps' departures from the usual one, as a share
};
/// Whether from one sample to the next, at these times, time was lost. `usual_s` is the usual step.
[[nodiscard]] bool is_gap(double from_s, double to_s, double usual_s, double rounding_s);
/// Adds a gap.
void add_gap(StepCourse& steps, double from_s, double to_s, double usual_s);
/// Adds a step to the scatter where it is no gap.
void add_scatter(StepCourse& steps, double from_s, double to_s, double usual_s);
void append(StepCourse& steps, const StepCourse& later);
void report_gaps(const StepCourse& steps, Findings& findings);
void report_jitter(const StepCourse& steps, double usual_s, double rounding_s, Findings& findings);
/// Of the steps that go forward; 0 when none does.
[[nodiscard]] double median_forward_step(const std::vector<double>& times_s);

/// Time stamps in seconds, one for each value, with the step to which they were rounded when they were
/// written (0: not known). Uniform where every stamp agrees with equal steps within that rounding: the rate
/// then comes from a straight line through all of them. Else rows with repeated or backward stamps are left
/// out, a clock that was set back goes on from where it stood, and the stamps themselves are the clock. Rows
/// without a stamp or a value are left out. Each of these is a finding with count and first place,
/// `first_row` being the line of the first value in the file. Precondition: equal sizes.
[[nodiscard]] Timed clock_from_stamps(std::vector<double> times_s, std::vector<double> values,
                                      double rounding_s);

/// The clock that `clock_from_stamps` would find for these stamps where it is uniform; nothing otherwise.
[[nodiscard]] std::optional<SampleClock> steady_clock(const StampCourse& course, double rounding_s);

/// Values on a uniform clock; missing ones are left out with the times of the others kept.
[[nodiscard]] Timed on_clock(SampleClock clock, std::vector<double> values);

/// From numbers in a unit of so many seconds to seconds, divided where the unit is a fraction of a second.
void scale_times(std::vector<double>& times, double seconds_per_unit);

/// Clock times without a date begin again at midnight: adds a day at each such place. Seconds since midnight.
void unwrap_midnight(std::vector<double>& times_s);

/// Equal steps at a stated rate; missing values are left out with their times kept.
[[nodiscard]] Timed clock_from_rate(double rate_hz, double start_s, std::vector<double> values);

}  // namespace ringwright
