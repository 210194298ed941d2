#include "event/by_hand.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <span>

#include "event/health.hpp"
#include "event/spectrum.hpp"
#include "ringwright/error.hpp"

namespace ringwright::event_search {
namespace {

constexpr std::size_t fewest_samples = 8;

/// First sample not before `time_s`.
std::size_t sample_at_time(const Recording& recording, double time_s) {
    const SampleClock& clock = recording.clock;
    if (!clock.uniform()) {
        const auto at = std::lower_bound(clock.times_s.begin(), clock.times_s.end(), time_s);
        return static_cast<std::size_t>(at - clock.times_s.begin());
    }
    const double position = std::ceil((time_s - clock.start_s) * clock.sample_rate_hz - 1e-6);
    return std::min(static_cast<std::size_t>(std::max(0.0, position)), recording.size());
}

/// The decay that begins at the first value, on the time scale on which it is plainest.
std::optional<Found> decay_from_first(const Pyramid& pyramid, std::size_t size) {
    std::optional<Found> best;
    double most = 0.0;
    for (std::size_t level = 0; level < pyramid.levels(); ++level) {
        const std::span<const double> means = pyramid.level(level);
        const std::span<const double> points = means.subspan(0, std::min<std::size_t>(means.size(), 48));
        const std::optional<DecayFit> fit = fit_decay(points);
        if (!fit) continue;
        const double explained =
            std::sqrt(std::max(0.0, fit->total_sum - fit->residual_sum) / static_cast<double>(points.size()));
        const double score = explained * std::log1p(fit->explained_ratio());
        if (score <= most) continue;
        most = score;
        Found found;
        found.start.shape = at_level(fit->shape, level, 0);
        found.start.level = level;
        found.start.fit = *fit;
        found.start.amplitude = fit->envelope_at(0.0);
        found.start.noise_rms = fit->residual_rms();
        best = found;
    }
    if (best) best->course = follow_decay(pyramid, best->start, size);
    return best;
}

/// Clipping anywhere in the window: what the user chose is fitted as it stands.
std::optional<Finding> clipping_in(const Recording& recording, const Event& event, double start_s) {
    for (const SampleRange& range : recording.clipped) {
        if (range.end <= event.begin || range.begin >= event.rest_end) continue;
        return Finding{"clipped_samples", Severity::caution,
                       fmt::format("The window holds clipped samples, the first {:.4g} s into the recording. "
                                   "Begin it after the last of them, or lower the gain or the amplitude.",
                                   recording.clock.time_of(range.begin) - start_s)};
    }
    return {};
}

}  // namespace

SampleRange window_of(const WholeSpan& whole, const EventOptions& options) {
    const double start_s = whole.start_s, end_s = whole.end_s;
    const double from_s = options.from_s.value_or(start_s), to_s = options.to_s.value_or(end_s);
    const std::string place = !options.to_s     ? fmt::format("from {:.6g} s", from_s)
                              : !options.from_s ? fmt::format("to {:.6g} s", to_s)
                                                : fmt::format("{:.6g} s to {:.6g} s", from_s, to_s);
    if (options.from_s && options.to_s && !(from_s < to_s))
        throw UsageError({"--from/--to", place, "the window ends before it begins",
                          "Give a window whose end is later than its start."});
    if (!(from_s < end_s) || !(to_s > start_s))
        throw UsageError({"--from/--to", place,
                          fmt::format("the recording runs from {:.6g} s to {:.6g} s", start_s, end_s),
                          "Give a window inside the recording."});
    const std::size_t end = options.to_s ? whole.sample_at(to_s) : whole.size;
    const SampleRange window{whole.sample_at(from_s), end};
    if (window.end < window.begin + fewest_samples)
        throw UsageError(
            {"--from/--to", place,
             fmt::format("the window holds {} samples", window.end - std::min(window.begin, window.end)),
             fmt::format("Give a window of at least {} samples.", fewest_samples)});
    return window;
}

EventSearch search_by_hand(const Recording& recording, const EventOptions& options) {
    const std::size_t n = recording.size();
    const double start_s = n > 0 ? recording.clock.time_of(0) : 0.0;
    const WholeSpan whole{n, start_s, n > 0 ? recording.clock.time_of(n - 1) : 0.0,
                          [&](double time_s) { return sample_at_time(recording, time_s); }};
    return search_window(recording, window_of(whole, options), options, start_s);
}

EventSearch search_window(const Recording& recording, SampleRange window, const EventOptions& options,
                          double start_s) {
    Event event;
    event.by_hand = true;
    event.kind = options.kind.value_or(TestKind::pluck);
    event.kind_known = options.kind.has_value();
    event.begin = window.begin;
    event.end = event.rest_end = window.end;
    const Series series(recording);
    const std::size_t first = series.position_of(window.begin), last = series.position_of(window.end);
    const std::span<const double> values = series.values().subspan(first, last - first);
    const Pyramid pyramid(values);
    const std::optional<Found> decay = decay_from_first(pyramid, values.size());
    if (decay) {
        event.end = std::clamp(series.sample_at(first + decay->end()), event.begin + 1, window.end);
        event.noise_level = decay->start.noise_rms;
        event.start_amplitude = decay->start.amplitude;
        event.frequency_guess_hz = ringing_frequency(pyramid, series.rate_hz(), *decay, options.near_hz);
    }
    if (const auto finding = clipping_in(recording, event, start_s)) event.findings.push_back(*finding);
    EventSearch result;
    if (decay) {
        if (const auto finding = sampling_finding(decay->cycle())) event.findings.push_back(*finding);
        const std::span<const double> rest = values.subspan(decay->end(), values.size() - decay->end());
        if (const auto finding = hum_finding(rest, series.rate_hz(), 1.0 / decay->cycle()))
            result.findings.push_back(*finding);
    }
    result.events.push_back(event);
    return result;
}

}  // namespace ringwright::event_search
