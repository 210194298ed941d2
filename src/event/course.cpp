#include "event/course.hpp"

#include <algorithm>
#include <cmath>
#include <numbers>

#include "event/beat.hpp"

namespace ringwright::event_search {
namespace {

/// Amplitude and offset of one cycle.
struct Cycle {
    std::size_t block = 0;
    double offset = 0.0, amplitude = 0.0;
};

/// Beyond this damping ratio a decay is over within two cycles: it is followed by its fit, not cycle by
/// cycle.
constexpr double cycle_by_cycle_damping = 0.25;

std::vector<Cycle> cycles_of(std::span<const double> means, std::size_t first, std::size_t end,
                             const DecayShape& shape, std::size_t width) {
    std::vector<Cycle> cycles;
    const double frequency = shape.damped_angular_frequency();
    for (std::size_t k = first; k + width <= end; k += std::max<std::size_t>(1, width / 2)) {
        const DecayFit fit = fit_amplitudes(means.subspan(k, width), shape);
        cycles.push_back({k, fit.offset, std::hypot(fit.cosine_part, fit.sine_part / frequency)});
    }
    return cycles;
}

/// As many windows of one beat, a quarter of it apart; the amplitude is of both modes together.
std::vector<Cycle> beats_of(std::span<const double> means, std::size_t first, std::size_t end,
                            const TwoTermFit& pair, std::size_t width) {
    std::vector<Cycle> cycles;
    const double w1 = pair.first.damped_angular_frequency(), w2 = pair.second.damped_angular_frequency();
    for (std::size_t k = first; k + width <= end; k += std::max<std::size_t>(1, width / 4)) {
        const TwoTermFit fit = fit_two_amplitudes(means.subspan(k, width), pair.first, pair.second);
        const double one = std::hypot(fit.first_cosine, fit.first_sine / w1),
                     other = std::hypot(fit.second_cosine, fit.second_sine / w2);
        cycles.push_back({k, fit.offset, std::hypot(one, other)});
    }
    return cycles;
}

double quantile(std::vector<double> values, double share) {
    if (values.empty()) return 0.0;
    const auto at = static_cast<std::ptrdiff_t>(share * static_cast<double>(values.size() - 1));
    std::nth_element(values.begin(), values.begin() + at, values.end());
    return values[static_cast<std::size_t>(at)];
}

/// Typical scatter of a course about its own smooth trend.
double scatter(const std::vector<Cycle>& cycles, double Cycle::*member) {
    std::vector<double> departures;
    for (std::size_t j = 2; j + 2 < cycles.size(); ++j)
        departures.push_back(
            std::abs(cycles[j].*member - 0.5 * (cycles[j - 2].*member + cycles[j + 2].*member)));
    return 1.4 * quantile(std::move(departures), 0.4);
}

/// Index of the first cycle that the decay does not explain: the amplitude rises, or the rest position moves.
std::size_t first_disturbed(const std::vector<Cycle>& cycles, double noise, double amplitude) {
    const double amplitude_scatter = std::max(scatter(cycles, &Cycle::amplitude), 0.3 * noise);
    const double offset_scatter = std::max(scatter(cycles, &Cycle::offset), 0.3 * noise);
    constexpr std::size_t memory = 6;
    for (std::size_t j = 2; j < cycles.size(); ++j) {
        double lowest = cycles[j - 2].amplitude, rest = 0.0;
        const std::size_t from = j - 1 > memory ? j - 1 - memory : 0;
        for (std::size_t i = from; i + 1 < j; ++i) {
            lowest = std::max(lowest * 0.7, cycles[i].amplitude);
            rest += cycles[i].offset / static_cast<double>(j - 1 - from);
        }
        if (cycles[j].amplitude > 1.4 * std::min(lowest, cycles[j - 2].amplitude) + 6.0 * amplitude_scatter)
            return j;
        const double moved = std::abs(cycles[j].offset - rest);
        if (moved > 7.0 * offset_scatter + 0.15 * cycles[j].amplitude + 0.01 * amplitude) return j;
    }
    return cycles.size();
}

/// Least squares of ln amplitude: a straight line down to cycle `knee`, level after it.
struct Knee {
    std::size_t at = 0;
    double fall = 0.0, fall_uncertainty = 0.0, level = 0.0, scatter = 0.0;
    bool seen = false;
};

struct LineSums {
    double n = 0.0, x = 0.0, y = 0.0, xx = 0.0, xy = 0.0, yy = 0.0;
    void add(double at, double value) {
        n += 1.0, x += at, y += value, xx += at * at, xy += at * value, yy += value * value;
    }
    [[nodiscard]] double slope() const {
        const double spread = n * xx - x * x;
        return spread > 0.0 ? (n * xy - x * y) / spread : 0.0;
    }
    [[nodiscard]] double about_line() const {
        const double spread = xx - x * x / n;
        const double joint = xy - x * y / n;
        return std::max(0.0, yy - y * y / n - (spread > 0.0 ? joint * joint / spread : 0.0));
    }
    [[nodiscard]] double about_mean() const { return n > 0.0 ? std::max(0.0, yy - y * y / n) : 0.0; }
};

Knee find_knee(const std::vector<Cycle>& cycles, std::size_t count) {
    Knee knee;
    if (count < 3) return knee;
    std::vector<double> log_amplitude(count);
    for (std::size_t j = 0; j < count; ++j)
        log_amplitude[j] = std::log(std::max(cycles[j].amplitude, 1e-300));
    std::vector<LineSums> until(count + 1);
    for (std::size_t j = 0; j < count; ++j) {
        until[j + 1] = until[j];
        until[j + 1].add(static_cast<double>(j), log_amplitude[j]);
    }
    double least = until[count].about_line();
    knee.at = count;
    const double plain = least;
    for (std::size_t at = 2; at + 3 <= count; ++at) {
        LineSums after;
        const LineSums &all = until[count], &before = until[at];
        after.n = all.n - before.n, after.y = all.y - before.y, after.yy = all.yy - before.yy;
        const double level = after.y / after.n;
        const double line_end =
            before.y / before.n + before.slope() * (static_cast<double>(at) - before.x / before.n);
        if (before.slope() > 0.0 || level > line_end + 0.7 || level > log_amplitude.front() - 1.0) continue;
        const double cost = before.about_line() + after.about_mean();
        if (cost < least) least = cost, knee.at = at;
    }
    knee.seen = knee.at < count && least < 0.6 * plain;
    if (!knee.seen) knee.at = count;
    const LineSums& line = until[knee.at];
    const double length = static_cast<double>(knee.at - 1);
    knee.fall = -line.slope() * length;
    const double spread = line.xx - line.x * line.x / line.n;
    const double variance = line.n > 2.0 ? line.about_line() / (line.n - 2.0) : 0.0;
    knee.scatter = std::sqrt(variance);
    // Neighbouring cycles overlap by half: two of them are worth little more than one.
    knee.fall_uncertainty = spread > 0.0 ? std::sqrt(2.0 * variance / spread) * length : 0.0;
    if (knee.seen) knee.level = std::exp((until[count].y - line.y) / (until[count].n - line.n));
    return knee;
}

/// The same where the rest is so much longer than the decay that it hides the knee: sought in the first
/// cycles alone, then in more of them.
Knee find_early_knee(const std::vector<Cycle>& cycles, std::size_t count) {
    constexpr std::size_t first_look = 1200;
    const Knee knee = find_knee(cycles, count);
    if (knee.seen) return knee;
    for (std::size_t look = first_look; look < count; look *= 4)
        if (const Knee early = find_knee(cycles, look); early.seen) return early;
    return knee;
}

Course course_of(const std::vector<Cycle>& cycles, const Start& start, std::size_t first, std::size_t limit) {
    const std::size_t undisturbed = first_disturbed(cycles, start.fit.residual_rms(), start.amplitude);
    const Knee knee = find_early_knee(cycles, undisturbed);
    Course course;
    course.rest_end = undisturbed < cycles.size() ? cycles[undisturbed - 1].block : limit;
    course.end = knee.seen ? cycles[knee.at].block : course.rest_end;
    course.fall = knee.fall;
    course.fall_uncertainty = knee.fall_uncertainty;
    course.scatter = knee.scatter;
    if (undisturbed < 6) {
        const double seen = static_cast<double>(course.rest_end - first);
        course.fall = start.fit.shape.decay_rate() * seen;
        course.fall_uncertainty = 0.1 * course.fall;
    }
    course.reaches_noise = knee.seen;
    course.floor = knee.level;
    return course;
}

Course follow_ringing(std::span<const double> means, const Start& start, std::size_t first,
                      std::size_t limit) {
    const double frequency = start.fit.shape.damped_angular_frequency();
    const auto width =
        std::max<std::size_t>(6, static_cast<std::size_t>(std::lround(2.0 * std::numbers::pi / frequency)));
    return course_of(cycles_of(means, first, limit, start.fit.shape, width), start, first, limit);
}

/// Index of the first block of the settled stretch whose running mean has left the rest position.
std::size_t leaves_rest(std::span<const double> means, std::size_t from, std::size_t limit, double rest,
                        double noise, double amplitude, std::size_t width) {
    if (limit <= from + width) return limit;
    double sum = 0.0;
    for (std::size_t k = from; k < limit; ++k) {
        sum += means[k] - rest;
        if (k >= from + width) sum -= means[k - width] - rest;
        if (k + 1 < from + width) continue;
        const double moved = std::abs(sum) / static_cast<double>(width);
        if (moved > 3.0 * noise + 0.03 * amplitude) return k + 1 - width;
    }
    return limit;
}

/// Last moment after the start at which the fit is farther than `threshold` from its rest position.
double settling_time(const DecayFit& fit, double threshold) {
    constexpr int looks = 400;
    const double longest = 20.0 / fit.shape.slow_rate();
    int k = looks;
    while (k > 1 && std::abs(fit.value_at(longest * k / looks) - fit.offset) < threshold) --k;
    return longest * k / looks;
}

Course follow_settling(std::span<const double> means, const Start& start, std::size_t first,
                       std::size_t limit) {
    const DecayShape& shape = start.fit.shape;
    const double noise = std::max(start.fit.residual_rms(), 1e-4 * start.amplitude);
    const double settling = settling_time(start.fit, 1.5 * noise);
    const auto width = static_cast<std::size_t>(
        std::clamp(0.5 / shape.slow_rate(), 2.0, static_cast<double>(limit - first)));
    const double fitted = static_cast<double>(start.fit_block + start.fit.points - first);
    const auto check = static_cast<std::size_t>(std::min(settling, 0.8 * fitted));
    Course course;
    course.rest_end = leaves_rest(means, std::min(limit, first + check), limit, start.fit.offset, noise,
                                  start.amplitude, width);
    course.end = std::min(course.rest_end, first + static_cast<std::size_t>(settling));
    course.reaches_noise = course.end < course.rest_end;
    course.floor = noise;
    course.fall = shape.slow_rate() * static_cast<double>(course.rest_end - first);
    course.fall_uncertainty = 0.1 * course.fall;
    return course;
}

struct Blocks {
    std::span<const double> means;
    std::size_t first = 0, last = 0;
};

/// From the start to the limit; the block in which the start lies still holds some of the blow before it.
Blocks blocks_of(const Pyramid& pyramid, const Start& start, std::size_t limit) {
    Blocks blocks{pyramid.level(start.level), 0, 0};
    blocks.first = (start.position + (std::size_t{1} << start.level) - 1) >> start.level;
    blocks.last = std::max(blocks.first + 1, std::min(limit >> start.level, blocks.means.size()));
    return blocks;
}

Course in_positions(Course course, const Blocks& blocks, std::size_t level, std::size_t limit) {
    const bool whole = course.rest_end == blocks.last;
    course.end = course.end == blocks.last && whole ? limit : course.end << level;
    course.rest_end = whole ? limit : course.rest_end << level;
    course.end = std::min(course.end, course.rest_end);
    return course;
}

}  // namespace

Course follow_decay(const Pyramid& pyramid, const Start& start, std::size_t limit) {
    const Blocks blocks = blocks_of(pyramid, start, limit);
    const bool slow = start.shape.damping_ratio < cycle_by_cycle_damping;
    const Course course = slow ? follow_ringing(blocks.means, start, blocks.first, blocks.last)
                               : follow_settling(blocks.means, start, blocks.first, blocks.last);
    return in_positions(course, blocks, start.level, limit);
}

std::optional<Course> follow_beat(const Pyramid& pyramid, const Start& start, const TwoTermFit& pair,
                                  std::size_t limit) {
    constexpr std::size_t fewest = 3;
    const Blocks blocks = blocks_of(pyramid, start, limit);
    const auto width = static_cast<std::size_t>(std::lround(beat_length(pair)));
    const std::vector<Cycle> beats = beats_of(blocks.means, blocks.first, blocks.last, pair, width);
    if (beats.size() < fewest) return {};
    return in_positions(course_of(beats, start, blocks.first, blocks.last), blocks, start.level, limit);
}

}  // namespace ringwright::event_search
