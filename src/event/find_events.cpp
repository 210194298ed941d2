#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <numbers>

#include "event/by_hand.hpp"
#include "event/found.hpp"
#include "event/spectrum.hpp"
#include "ringwright/error.hpp"
#include "ringwright/event.hpp"

namespace ringwright {
namespace event_search {

double Found::cycle() const {
    return 2.0 * std::numbers::pi / start.shape.undamped_angular_frequency;
}

namespace {

constexpr std::size_t shortest_recording = 16;
/// Amplitude against noise of a decay that is worth reporting.
constexpr double least_amplitude = 3.0;
/// What the decay may leave unexplained over its first cycle, as a share of its height: of a long decay
/// (other modes ring along), of a short one (it has little else to show), of one that looks like a mere
/// pulse.
constexpr double misfit_of_long = 0.16, misfit_of_short = 0.06, misfit_of_pulse = 0.02;
/// Samples between the start and the noise.
constexpr std::size_t shortest_decay = 6;

bool shows_position(MeasuredQuantity quantity) {
    return quantity == MeasuredQuantity::displacement || quantity == MeasuredQuantity::angle;
}

struct Search {
    const Recording& recording;
    const Series& series;
    const Pyramid& pyramid;
    std::vector<Found> found;
    bool steady = false;  ///< something rang and did not fall
};

/// The end of a clipped stretch that holds the position, or that lies within a cycle after it.
std::size_t after_clipping(const Search& search, std::size_t position, double cycle) {
    std::size_t earliest = 0;
    for (const SampleRange& range : search.recording.clipped) {
        const std::size_t begin = search.series.position_of(range.begin),
                          end = search.series.position_of(range.end);
        if (static_cast<double>(begin) > static_cast<double>(std::max(position, earliest)) + 1.5 * cycle)
            break;
        if (static_cast<double>(end) + cycle > static_cast<double>(position)) earliest = end;
    }
    return earliest;
}

bool taken(const Search& search, const Onset& onset) {
    const std::size_t reach = std::size_t{4} << onset.level;
    return std::any_of(search.found.begin(), search.found.end(), [&](const Found& f) {
        const std::size_t margin = std::max(reach, static_cast<std::size_t>(f.cycle()));
        return onset.position + margin >= f.begin() && onset.position < f.course.rest_end;
    });
}

StartLimits limits_for(const Search& search, const Onset& onset) {
    StartLimits limits;
    limits.displacement = shows_position(search.recording.quantity);
    limits.latest = search.series.size();
    for (const Found& other : search.found) {
        if (other.begin() > onset.position) {
            limits.latest = std::min(limits.latest, other.begin());
        } else {
            limits.earliest = std::max(limits.earliest, other.course.rest_end);
        }
    }
    const double cycle = 2.0 * std::numbers::pi / onset.fit.shape.undamped_angular_frequency *
                         static_cast<double>(std::size_t{1} << onset.level);
    limits.earliest = std::max(limits.earliest, after_clipping(search, onset.position, cycle));
    return limits;
}

/// Start and course, the start a second time with the noise that the rest shows.
std::optional<Found> follow_onset(const Search& search, const Onset& onset, StartLimits limits) {
    std::optional<Start> start = locate_start(search.pyramid, onset, limits);
    if (!start || start->position + 8 > limits.latest) return {};
    Course course = follow_decay(search.pyramid, *start, limits.latest);
    if (course.reaches_noise) {
        limits.rest = SampleRange{course.end, course.rest_end};
        if (std::optional<Start> again = locate_start(search.pyramid, onset, limits)) {
            if (again->position + 8 <= limits.latest) {
                start = again;
                course = follow_decay(search.pyramid, *start, limits.latest);
            }
        }
    }
    return Found{*start, course, 0, 0, {}};
}

/// Standard deviation of single values in the rest: of the quieter among its pieces, since a stray knock in
/// it is no noise. 0 when there is no rest.
double rest_rms(std::span<const double> values, const Course& course) {
    constexpr std::size_t pieces = 12, shortest = 16, longest = 20000;
    if (!course.reaches_noise || course.rest_end < course.end + shortest) return 0.0;
    const std::size_t rest = course.rest_end - course.end;
    const std::size_t length = std::min(longest, std::max(shortest, rest / pieces));
    std::vector<double> deviations;
    for (std::size_t k = course.end; k + length <= course.rest_end; k += std::max(length, rest / pieces)) {
        double sum = 0.0, squares = 0.0;
        for (std::size_t i = k; i < k + length; ++i) {
            const double y = values[i] - values[k];
            sum += y, squares += y * y;
        }
        const auto n = static_cast<double>(length);
        deviations.push_back(std::sqrt(std::max(0.0, (squares - sum * sum / n) / (n - 1.0))));
    }
    const auto at = deviations.begin() + static_cast<std::ptrdiff_t>(deviations.size() / 3);
    std::nth_element(deviations.begin(), at, deviations.end());
    return *at;
}

double range_of(std::span<const double> values) {
    const auto [low, high] = std::minmax_element(values.begin(), values.end());
    return *high - *low;
}

/// Whether the start belongs to a pulse that fell in less than twice the time in which it rose.
bool on_a_pulse(std::span<const double> values, const Found& found, double height) {
    const double rest = found.start.fit.offset;
    const double sign = values[found.begin()] > rest ? 1.0 : -1.0;
    const auto above = [&](std::size_t k) { return sign * (values[k] - rest) > 0.1 * height; };
    std::size_t first = found.begin(), last = found.begin(), peak = found.begin();
    while (first > 0 && above(first)) --first;
    while (last + 1 < values.size() && above(last)) ++last;
    for (std::size_t k = first; k < last; ++k)
        if (sign * values[k] > sign * values[peak]) peak = k;
    return first > 0 && last - peak < 2 * (peak - first);
}

/// Whether one free decay explains what follows the start: not a pulse, a filter's answer or a wiggle of
/// noise.
bool believable(const Search& search, const Found& found) {
    const Start& start = found.start;
    const std::span<const double> values = search.series.values();
    const std::size_t cycle = static_cast<std::size_t>(std::min(found.cycle(), 1e15)) + 8;
    const std::size_t stop = std::min({values.size(), found.begin() + cycle, found.course.rest_end});
    if (found.course.end < found.begin() + shortest_decay) return false;
    const double height = range_of(values.subspan(found.begin(), stop - found.begin()));
    if (start.amplitude > 3.0 * height || start.amplitude < least_amplitude * start.noise_rms) return false;
    const double cycles = static_cast<double>(found.course.end - found.begin()) / found.cycle();
    const bool cut = !found.course.reaches_noise && found.course.rest_end < values.size();
    if (cut && cycles < 1.5) return false;
    const double noise = rest_rms(values, found.course);
    const double amplitude = std::min(start.amplitude, height);
    double misfit = cycles < 3.0 && noise > 0.0 ? misfit_of_short : misfit_of_long;
    if (misfit == misfit_of_short && on_a_pulse(values, found, height)) misfit = misfit_of_pulse;
    return start.noise_rms < std::max(misfit * amplitude, 2.5 * noise);
}

void try_onset(Search& search, const Onset& onset) {
    if (taken(search, onset)) return;
    const StartLimits limits = limits_for(search, onset);
    if (limits.latest <= onset.position + 12) return;
    std::optional<Found> found = follow_onset(search, onset, limits);
    if (!found || !believable(search, *found)) return;
    if (!found->course.falls()) {
        search.steady = true;
        return;
    }
    search.found.push_back(std::move(*found));
}

/// What stands out of the noise of the recording no more than noise does is no event.
void drop_weak(std::vector<Found>& found, std::span<const double> values) {
    constexpr double stands_out = 6.0;
    double largest = 0.0, noise = 0.0;
    for (const Found& f : found) {
        if (f.start.amplitude <= largest) continue;
        largest = f.start.amplitude;
        noise = rest_rms(values, f.course);
    }
    std::erase_if(found, [&](const Found& f) {
        return f.start.amplitude < 0.5 * largest && f.start.amplitude < stands_out * noise;
    });
}

/// A slow pull to a plateau that the next release leaves is no decay.
bool is_pull_to(const Found& pull, const Found& release) {
    if (!release.start.from_rest) return false;
    const double speed =
        pull.start.shape.undamped_angular_frequency / release.start.shape.undamped_angular_frequency;
    return speed < 0.7;
}

void drop_pulls(std::vector<Found>& found) {
    std::vector<Found> kept;
    for (std::size_t i = 0; i < found.size(); ++i) {
        if (i + 1 < found.size() && is_pull_to(found[i], found[i + 1])) continue;
        kept.push_back(std::move(found[i]));
    }
    found = std::move(kept);
}

/// A decay that the next hit cuts short: the hit is a second one of the same test unless much was seen.
void judge_interruptions(std::vector<Found>& found, const Series& series) {
    std::vector<Found> kept;
    for (std::size_t i = 0; i < found.size(); ++i) {
        const bool cut = i + 1 < found.size() && !found[i].course.reaches_noise &&
                         static_cast<double>(found[i + 1].begin()) <
                             static_cast<double>(found[i].course.rest_end) + 2.0 * found[i].cycle();
        if (!cut) {
            kept.push_back(std::move(found[i]));
            continue;
        }
        const double time_s = static_cast<double>(found[i + 1].begin()) / series.rate_hz();
        const double cycles =
            static_cast<double>(found[i].course.rest_end - found[i].begin()) / found[i].cycle();
        if (cycles < 12.0 && found[i].course.fall < 1.5) {
            found[i + 1].findings.push_back(
                {"double_hit", Severity::caution,
                 fmt::format(
                     "A second disturbance came {:.3g} s into the recording while the first still rang. "
                     "Only the decay after the last one is used; repeat the test if it looks short.",
                     time_s)});
        } else {
            found[i].findings.push_back(
                {"next_event_too_soon", Severity::note,
                 "The next release or hit came before this decay had reached the noise. Wait longer between "
                 "them to see the whole decay."});
            kept.push_back(std::move(found[i]));
        }
    }
    found = std::move(kept);
}

/// The undisturbed stretch before each event: the rest after the one before it, or the head of the recording.
void find_quiet(std::vector<Found>& found, const Pyramid& pyramid) {
    for (std::size_t i = 0; i < found.size(); ++i) {
        if (i > 0) {
            found[i].quiet_begin = found[i - 1].course.end;
            found[i].quiet_end = found[i - 1].course.rest_end;
            continue;
        }
        const Start& start = found[i].start;
        const std::span<const double> means = pyramid.level(start.level);
        const std::size_t last = start.position >> start.level;
        const double tolerance = std::max(4.0 * start.fit.residual_rms(), 0.01 * start.amplitude);
        std::size_t k = 0;
        while (k < last && std::abs(means[k] - start.fit.offset) < tolerance) ++k;
        if (k >= 8) found[i].quiet_end = (k - 4) << start.level;
    }
}

Event to_event(const Found& found, const Search& search, const EventOptions& options) {
    const Series& series = search.series;
    Event event;
    event.quiet_begin = series.sample_at(found.quiet_begin);
    event.quiet_end = series.sample_at(found.quiet_end);
    event.begin = series.sample_at(found.begin());
    event.end = series.sample_at(found.end());
    event.rest_end = series.sample_at(found.course.rest_end);
    const double rest = rest_rms(series.values(), found.course);
    event.noise_level = rest > 0.0 ? rest : found.start.noise_rms;
    event.start_amplitude = found.start.amplitude;
    event.kind = options.kind.value_or(TestKind::pluck);
    event.kind_known = options.kind.has_value() || found.start.from_rest;
    event.frequency_guess_hz = ringing_frequency(search.pyramid, series.rate_hz(), found, options.near_hz);
    event.findings = found.findings;
    return event;
}

std::string reason_for_none(const Search& search) {
    if (search.steady)
        return "The recording oscillates, but its amplitude does not fall: a steady or forced motion is no "
               "free "
               "decay. Record a single release, tap or drop with the drive switched off.";
    return "Nothing in the recording starts suddenly and then dies away as a free decay does. Check the "
           "channel, "
           "the trigger and the sensor, or give the window with --from and --to.";
}

bool constant(const Series& series) {
    const auto [low, high] = std::minmax_element(series.values().begin(), series.values().end());
    return !(*high > *low);
}

EventSearch search_whole(const Recording& recording, const EventOptions& options) {
    EventSearch result;
    if (recording.size() < shortest_recording) {
        result.reason =
            fmt::format("The recording holds {} samples; a decay cannot be told from fewer than {}.",
                        recording.size(), shortest_recording);
        result.findings.push_back({"too_short_record", Severity::defect, result.reason});
        return result;
    }
    const Series series(recording);
    if (constant(series)) {
        result.reason = "Every sample has the same value. Check the sensor, its cable and the channel.";
        return result;
    }
    const Pyramid pyramid(series.values());
    Search search{recording, series, pyramid, {}, false};
    for (const Onset& onset : find_onsets(pyramid)) try_onset(search, onset);
    std::sort(search.found.begin(), search.found.end(),
              [](const Found& a, const Found& b) { return a.begin() < b.begin(); });
    drop_weak(search.found, series.values());
    drop_pulls(search.found);
    judge_interruptions(search.found, series);
    find_quiet(search.found, pyramid);
    for (const Found& found : search.found) result.events.push_back(to_event(found, search, options));
    if (result.events.empty()) result.reason = reason_for_none(search);
    return result;
}

}  // namespace
}  // namespace event_search

std::string_view to_text(TestKind kind) {
    switch (kind) {
        case TestKind::pluck:
            return "pluck";
        case TestKind::tap:
            return "tap";
        case TestKind::drop:
            return "drop";
    }
    return "pluck";
}

std::optional<TestKind> test_kind_from_text(std::string_view text) {
    for (const TestKind kind : {TestKind::pluck, TestKind::tap, TestKind::drop}) {
        if (text == to_text(kind)) return kind;
    }
    return {};
}

EventSearch find_events(const Recording& recording, const EventOptions& options) {
    if (options.from_s || options.to_s) return event_search::search_by_hand(recording, options);
    return event_search::search_whole(recording, options);
}

}  // namespace ringwright
