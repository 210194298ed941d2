#include "recording/clock.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <optional>

#include "ringwright/counting.hpp"

namespace ringwright {
namespace {

// Longer than this many usual steps, a step is a gap.
constexpr double gap_steps = 1.5;

struct Line {
    double start = 0.0;
    double step = 0.0;
    double worst = 0.0;  // half of the band about the line that holds every stamp
};

double first_of(const std::vector<double>& t) {
    return t.front();
}
double last_of(const std::vector<double>& t) {
    return t.back();
}
std::size_t count_of(const std::vector<double>& t) {
    return t.size();
}
double first_of(const StampCourse& course) {
    return course.first;
}
double last_of(const StampCourse& course) {
    return course.last;
}
std::size_t count_of(const StampCourse& course) {
    return course.count;
}

// Least squares of the stamps against their number, about the middle so that nothing cancels.
Line fitted_line(const std::vector<double>& t) {
    const auto n = static_cast<double>(t.size());
    const double middle = 0.5 * (n - 1.0);
    const double reference = t.front();
    double sum = 0.0, weighted = 0.0;
    for (std::size_t i = 0; i < t.size(); ++i) {
        sum += t[i] - reference;
        weighted += (t[i] - reference) * (static_cast<double>(i) - middle);
    }
    Line line;
    line.step = weighted / (n * (n * n - 1.0) / 12.0);
    line.start = reference + sum / n - line.step * middle;
    return line;
}

Line fitted_line(const StampCourse& course) {
    const auto n = static_cast<long double>(course.count);
    const long double middle = 0.5L * (n - 1.0L);
    const long double step = (course.weighted - middle * course.sum) / (n * (n * n - 1.0L) / 12.0L);
    Line line;
    line.step = static_cast<double>(step);
    line.start = static_cast<double>(course.first + course.sum / n - step * middle);
    return line;
}

Band band_about(const std::vector<double>& t, double start, double step) {
    Band band;
    for (std::size_t i = 0; i < t.size(); ++i) {
        const double distance = t[i] - start - step * static_cast<double>(i);
        band.low = i == 0 ? distance : std::min(band.low, distance);
        band.high = i == 0 ? distance : std::max(band.high, distance);
    }
    return band;
}

// Moves the line to the middle of the band that holds every stamp: rounding and truncation then look alike.
template <typename Stamps>
void centre(Line& line, const Stamps& t) {
    const Band band = band_about(t, line.start, line.step);
    line.start += 0.5 * (band.low + band.high);
    line.worst = 0.5 * (band.high - band.low);
}

template <typename Stamps>
double worst_distance(const Stamps& t, double start, double step) {
    const Band band = band_about(t, start, step);
    return std::max(std::abs(band.low), std::abs(band.high));
}

// How far a stamp of a steady clock may lie from the line: rounding to the last written digit (half a step of
// it, a little more because the line is fitted to rounded stamps), the digits of a double, and a thousandth
// of a sampling step, which no method here can feel.
template <typename Stamps>
double tolerance(const Stamps& t, double step, double rounding) {
    const double magnitude = std::max(std::abs(first_of(t)), std::abs(last_of(t)));
    return 0.53 * rounding + 2e-3 * std::abs(step) + 8e-16 * magnitude;
}

double rounded_to_digits(double value, int digits) {
    const double scale = std::pow(10.0, digits - 1 - std::floor(std::log10(std::abs(value))));
    return std::round(value * scale) / scale;
}

// The rate with the fewest digits that the stamps allow: 2000 Hz, not 2000.0000013 Hz.
std::optional<double> plain_rate(std::size_t count, const Line& line, double allowed) {
    const double slack = std::max(allowed - line.worst, 0.1 * allowed) / static_cast<double>(count);
    const double rate = 1.0 / line.step;
    for (int digits = 1; digits <= 9; ++digits)
        for (const double candidate :
             {rounded_to_digits(rate, digits), 1.0 / rounded_to_digits(line.step, digits)})
            if (std::abs(1.0 / candidate - line.step) <= slack) return candidate;
    return std::nullopt;
}

template <typename Stamps>
std::optional<SampleClock> uniform_clock(const Stamps& t, double rounding) {
    if (count_of(t) < 3) return std::nullopt;
    Line line = fitted_line(t);
    if (!(line.step > 0.0) || !std::isfinite(line.step)) return std::nullopt;
    const double allowed = tolerance(t, line.step, rounding);
    centre(line, t);
    if (line.worst > allowed) return std::nullopt;
    SampleClock clock;
    clock.sample_rate_hz = 1.0 / line.step;
    clock.start_s = line.start;
    if (const auto plain = plain_rate(count_of(t), line, allowed)) {
        clock.sample_rate_hz = *plain;
        const double middle = 0.5 * static_cast<double>(count_of(t) - 1);
        clock.start_s = line.start + middle * (line.step - 1.0 / *plain);
    }
    // The first stamp itself where the line allows it, so that "0" stays 0.
    if (worst_distance(t, first_of(t), 1.0 / clock.sample_rate_hz) <= 2.0 * allowed)
        clock.start_s = first_of(t);
    return clock;
}

// Many samples share each stamp: the places where the stamp changes are the clock, and the rate is the number
// of samples between the first and the last of them over the time between.
std::optional<SampleClock> staircase_clock(const std::vector<double>& t, double rounding) {
    std::size_t first = 0, last = 0;
    for (std::size_t i = 1; i < t.size(); ++i) {
        if (t[i] == t[i - 1]) continue;
        if (t[i] < t[i - 1] + 0.9 * rounding) return std::nullopt;
        if (first == 0) first = i;
        last = i;
    }
    if (last == first || !(rounding > 0.0)) return std::nullopt;
    SampleClock clock;
    clock.sample_rate_hz = static_cast<double>(last - first) / (t[last] - t[first]);
    clock.start_s = t[first] - static_cast<double>(first) / clock.sample_rate_hz;
    if (rounding * clock.sample_rate_hz < 8.0) return std::nullopt;  // fewer: a line through all is as good
    if (worst_distance(t, clock.start_s, 1.0 / clock.sample_rate_hz) > 1.1 * rounding) return std::nullopt;
    return clock;
}

double median_of(std::vector<double> values) {
    if (values.empty()) return 0.0;
    const auto middle = values.begin() + static_cast<std::ptrdiff_t>(values.size() / 2);
    std::nth_element(values.begin(), middle, values.end());
    return *middle;
}

void add(Findings& findings, const char* code, Severity severity, std::string message) {
    findings.push_back(Finding{code, severity, std::move(message)});
}

// Rows that lack a stamp cannot be placed.
void drop_unstamped(std::vector<double>& t, std::vector<double>& x) {
    std::size_t kept = 0;
    for (std::size_t i = 0; i < t.size(); ++i) {
        if (std::isnan(t[i])) continue;
        t[kept] = t[i];
        x[kept++] = x[i];
    }
    t.resize(kept);
    x.resize(kept);
}

struct Disorder {
    std::size_t repeated = 0, backward = 0, set_back = 0;
    double first_repeated = 0.0, first_backward = 0.0, first_set_back = 0.0;
    std::vector<double> set_back_at;
};

// Leaves out rows whose stamp does not go forward; a clock that jumps back and then runs on is shifted.
class Straightener {
  public:
    Straightener(std::vector<double>& t, std::vector<double>& x, double step) : t_(t), x_(x), step_(step) {}

    Disorder run() {
        double shift = 0.0;
        for (std::size_t i = 0; i < t_.size(); ++i) {
            const double time = t_[i] + shift;
            if (kept_ == 0 || time > t_[kept_ - 1]) {
                if (runs_ahead(i, time, shift)) {
                    count_backward(t_[i]);
                    continue;
                }
                keep(i, time);
            } else if (time == t_[kept_ - 1]) {
                if (disorder_.repeated++ == 0) disorder_.first_repeated = t_[i];
            } else if (const double shifted = shift + t_[kept_ - 1] + step_ - time;
                       runs_on(i, shift) && t_[i] + shifted > t_[kept_ - 1]) {
                shift = shifted;
                if (disorder_.set_back++ == 0) disorder_.first_set_back = t_[i];
                keep(i, t_[i] + shift);
            } else {
                count_backward(t_[i]);
            }
        }
        t_.resize(kept_);
        x_.resize(kept_);
        return std::move(disorder_);
    }

  private:
    void keep(std::size_t i, double time) {
        x_[kept_] = x_[i];
        t_[kept_++] = time;
    }
    void count_backward(double time) {
        if (disorder_.backward++ == 0) disorder_.first_backward = time;
    }
    // One stamp far ahead of its neighbours: the next rows go on as if it were not there.
    [[nodiscard]] bool runs_ahead(std::size_t i, double time, double shift) const {
        if (kept_ == 0 || i + 2 >= t_.size() || time < t_[kept_ - 1] + 4.0 * step_) return false;
        const double next = t_[i + 1] + shift, after = t_[i + 2] + shift;
        return next < time && next > t_[kept_ - 1] && after > next && next < t_[kept_ - 1] + 4.0 * step_;
    }
    // The clock was set back: the following stamps stay behind and go forward among themselves.
    [[nodiscard]] bool runs_on(std::size_t i, double shift) const {
        if (i + 4 >= t_.size()) return false;
        for (std::size_t j = i; j < i + 4; ++j)
            if (t_[j + 1] <= t_[j] || t_[j + 1] + shift > t_[kept_ - 1]) return false;
        return true;
    }

    std::vector<double>& t_;
    std::vector<double>& x_;
    double step_;
    std::size_t kept_ = 0;
    Disorder disorder_;
};

void report(const Disorder& disorder, Findings& findings) {
    if (disorder.repeated > 0)
        add(findings, "repeated_time_stamps", Severity::caution,
            fmt::format("{} the time stamp of the row before (first at {:.6g} s) and {} left out.",
                        counted(disorder.repeated, "row repeats", "rows repeat"), disorder.first_repeated,
                        disorder.repeated == 1 ? "was" : "were"));
    if (disorder.backward > 0)
        add(findings, "backward_time_stamps", Severity::caution,
            fmt::format(
                "{} a time stamp that runs backward or far ahead (first at {:.6g} s) and {} left out.",
                counted(disorder.backward, "row has", "rows have"), disorder.first_backward,
                disorder.backward == 1 ? "was" : "were"));
    if (disorder.set_back > 0)
        add(findings, "clock_set_back", Severity::defect,
            fmt::format(
                "The clock jumps back {} (first to {:.6g} s) and runs on from there; what follows was "
                "placed one step after what went before. Give the stretch that matters with --from and --to.",
                counted(disorder.set_back, "time"), disorder.first_set_back));
}

bool any_missing(const std::vector<double>& x) {
    bool any = false;
    for (const double v : x) any |= std::isnan(v);
    return any;
}

// Rows without a value are left out; with a uniform clock the times of the others are then written out.
void drop_missing(Timed& timed) {
    std::vector<double>& x = timed.values;
    if (!any_missing(x)) {
        if (!x.empty() && !timed.clock.uniform()) timed.clock.start_s = timed.clock.times_s.front();
        return;
    }
    std::size_t first = 0, last = x.size();
    while (first < last && std::isnan(x[first])) ++first;
    while (last > first && std::isnan(x[last - 1])) --last;
    const bool inner =
        std::any_of(x.begin() + static_cast<std::ptrdiff_t>(first),
                    x.begin() + static_cast<std::ptrdiff_t>(last), [](double v) { return std::isnan(v); });
    SampleClock& clock = timed.clock;
    if (inner && clock.uniform()) {
        clock.times_s.resize(x.size());
        for (std::size_t i = 0; i < x.size(); ++i)
            clock.times_s[i] = clock.start_s + static_cast<double>(i) / clock.sample_rate_hz;
    } else if (clock.uniform()) {
        clock.start_s += static_cast<double>(first) / clock.sample_rate_hz;
    }
    std::size_t kept = 0;
    for (std::size_t i = 0; i < x.size(); ++i) {
        if (std::isnan(x[i])) continue;
        if (!clock.times_s.empty()) clock.times_s[kept] = clock.times_s[i];
        x[kept++] = x[i];
    }
    x.resize(kept);
    if (clock.times_s.empty()) return;
    clock.times_s.resize(kept);
    if (kept > 0) clock.start_s = clock.times_s.front();
}

void find_gaps(Timed& timed, double step, double rounding) {
    const std::vector<double>& t = timed.clock.times_s;
    StepCourse steps;
    for (std::size_t i = 1; i < t.size(); ++i) {
        if (!is_gap(t[i - 1], t[i], step, rounding)) continue;
        timed.gaps.push_back({i - 1, i});
        add_gap(steps, t[i - 1], t[i], step);
    }
    report_gaps(steps, timed.findings);
}

void report_jitter(Timed& timed, double step, double rounding) {
    const std::vector<double>& t = timed.clock.times_s;
    StepCourse steps;
    for (std::size_t i = 1; i < t.size(); ++i) add_scatter(steps, t[i - 1], t[i], step);
    report_jitter(steps, step, rounding, timed.findings);
}

// The rate then hangs on the places where the stamp changes: a sample or so at the ends.
void report_coarse(Timed& timed, double rounding) {
    const auto count = static_cast<double>(timed.values.size());
    add(timed.findings, "coarse_time_stamps", Severity::caution,
        fmt::format(
            "The times are written in steps of {:.3g} s only, so that many rows share one; the sampling rate "
            "of "
            "{:.6g} Hz was taken from the places where they change and is certain to about {:.2g} %. Give it "
            "with --rate if it is known.",
            rounding, timed.clock.sample_rate_hz, 100.0 * 2.0 / count));
}

}  // namespace

double median_forward_step(const std::vector<double>& t) {
    std::vector<double> steps;
    steps.reserve(t.size());
    for (std::size_t i = 1; i < t.size(); ++i)
        if (t[i] > t[i - 1]) steps.push_back(t[i] - t[i - 1]);
    return median_of(std::move(steps));
}

bool is_gap(double from_s, double to_s, double usual_s, double rounding_s) {
    return !(to_s - from_s <= gap_steps * usual_s + 2.0 * rounding_s);
}

void add_gap(StepCourse& steps, double from_s, double to_s, double usual_s) {
    const double wide = to_s - from_s;
    ++steps.gaps;
    steps.lost_s += wide - usual_s;
    if (wide > steps.longest_s) steps.longest_s = wide, steps.longest_at_s = from_s;
}

void add_scatter(StepCourse& steps, double from_s, double to_s, double usual_s) {
    const double deviation = (to_s - from_s) / usual_s - 1.0;
    if (deviation > gap_steps - 1.0) return;
    steps.scatter += deviation * deviation;
    ++steps.even;
}

void append(StepCourse& steps, const StepCourse& later) {
    steps.gaps += later.gaps;
    steps.even += later.even;
    steps.lost_s += later.lost_s;
    steps.scatter += later.scatter;
    if (later.longest_s > steps.longest_s)
        steps.longest_s = later.longest_s, steps.longest_at_s = later.longest_at_s;
}

void report_gaps(const StepCourse& steps, Findings& findings) {
    if (steps.gaps == 0) return;
    add(findings, "gaps", Severity::caution,
        fmt::format(
            "Time is lost at {}, {:.4g} s in all (the longest: {:.4g} s after {:.6g} s). The times as "
            "recorded are used.",
            counted(steps.gaps, "place"), steps.lost_s, steps.longest_s, steps.longest_at_s));
}

void report_jitter(const StepCourse& steps, double usual_s, double rounding_s, Findings& findings) {
    const double share = steps.even == 0 ? 0.0 : std::sqrt(steps.scatter / static_cast<double>(steps.even));
    if (share < 0.005 || share < 0.6 * rounding_s / usual_s) return;
    add(findings, "jittering_time_stamps", share > 0.2 ? Severity::caution : Severity::note,
        fmt::format("The sampling steps scatter by {:.2g} % about {:.6g} s. The times as recorded are used.",
                    100.0 * share, usual_s));
}

void unwrap_midnight(std::vector<double>& times_s) {
    double days = 0.0;
    double last = times_s.empty() ? 0.0 : times_s.front();
    for (double& time : times_s) {
        const double raw = time;
        if (raw < last - 43200.0) days += 86400.0;
        if (!std::isnan(raw)) last = raw;
        time = raw + days;
    }
}

Timed clock_from_stamps(std::vector<double> times_s, std::vector<double> values, double rounding_s) {
    Timed timed;
    drop_unstamped(times_s, values);
    auto uniform = staircase_clock(times_s, rounding_s);
    const bool coarse = uniform.has_value();
    if (!coarse) uniform = uniform_clock(times_s, rounding_s);
    double step = uniform ? 1.0 / uniform->sample_rate_hz : 0.0;
    if (!uniform) {
        step = median_forward_step(times_s);
        report(Straightener(times_s, values, step).run(), timed.findings);
        uniform = uniform_clock(times_s, rounding_s);
    }
    timed.values = std::move(values);
    if (uniform) {
        timed.clock = *uniform;
        if (coarse) report_coarse(timed, rounding_s);
        step = 1.0 / uniform->sample_rate_hz;
    } else {
        timed.clock.times_s = std::move(times_s);
        timed.clock.sample_rate_hz = step > 0.0 ? 1.0 / step : 1.0;
        timed.clock.start_s = timed.clock.times_s.empty() ? 0.0 : timed.clock.times_s.front();
        report_jitter(timed, step, rounding_s);
    }
    drop_missing(timed);
    find_gaps(timed, step, uniform ? 0.0 : rounding_s);
    return timed;
}

void scale_times(std::vector<double>& times, double seconds_per_unit) {
    if (seconds_per_unit == 1.0) return;
    const double units_per_second = std::round(1.0 / seconds_per_unit);
    for (double& t : times) t = seconds_per_unit < 1.0 ? t / units_per_second : t * seconds_per_unit;
}

Timed on_clock(SampleClock clock, std::vector<double> values) {
    Timed timed;
    timed.values = std::move(values);
    timed.clock = std::move(clock);
    const double step = 1.0 / timed.clock.sample_rate_hz;
    drop_missing(timed);
    find_gaps(timed, step, 0.0);
    return timed;
}

std::optional<SampleClock> steady_clock(const StampCourse& course, double rounding_s) {
    if (!course.forward) return std::nullopt;
    return uniform_clock(course, rounding_s);
}

Timed clock_from_rate(double rate_hz, double start_s, std::vector<double> values) {
    SampleClock clock;
    clock.sample_rate_hz = rate_hz;
    clock.start_s = start_s;
    return on_clock(std::move(clock), std::move(values));
}

}  // namespace ringwright
