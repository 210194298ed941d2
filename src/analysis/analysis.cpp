#include "ringwright/analysis.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <atomic>
#include <cmath>
#include <functional>
#include <optional>
#include <thread>
#include <utility>

#include "analysis/result.hpp"
#include "analysis/series.hpp"

namespace ringwright {
namespace {

/// Runs task(0) … task(count − 1) on as many threads as asked; each task writes only its own place, so that
/// the result does not depend on the number of threads. Tasks do not throw.
void for_each_index(std::size_t count, unsigned jobs, const std::function<void(std::size_t)>& task) {
    const unsigned hardware = std::max(1U, std::thread::hardware_concurrency());
    const std::size_t threads = std::min<std::size_t>(jobs == 0 ? hardware : jobs, count);
    if (threads < 2) {
        for (std::size_t i = 0; i < count; ++i) task(i);
        return;
    }
    std::atomic<std::size_t> next{0};
    std::vector<std::jthread> pool;
    for (std::size_t t = 0; t < threads; ++t)
        pool.emplace_back([&] {
            for (std::size_t i = next++; i < count; i = next++) task(i);
        });
}

RecordingIdentification search(RecordingInput input, const EventOptions& options) {
    RecordingIdentification result;
    EventSearch found = find_events(input.recording, options);
    result.sample_count = input.recording.size();
    result.duration_s = input.recording.duration_s();
    result.findings = input.recording.findings;
    result.findings.insert(result.findings.end(), found.findings.begin(), found.findings.end());
    result.reason = std::move(found.reason);
    result.added_mass = std::move(input.added_mass);
    result.recording = std::move(input.recording);
    for (Event& event : found.events) {
        result.events.emplace_back();
        result.events.back().event = std::move(event);
    }
    return result;
}

/// JSON holds no infinity, so an interval without an end has no key there; this says why.
void note_open_intervals(EventIdentification& event) {
    for (const analysis::Method& method : analysis::methods_in_order_of_preference())
        for (const auto& [quantity, estimate] : (event.*method.result).quantities) {
            if (std::isfinite(estimate.interval.low) && std::isfinite(estimate.interval.high)) continue;
            event.findings.push_back(
                {"interval_without_end", Severity::caution,
                 fmt::format("The {} cannot bound the {} on both sides: the decay shows too little of it.",
                             method.name, name_of(quantity))});
        }
}

void identify_all(std::vector<RecordingIdentification>& recordings, const AnalysisOptions& options,
                  const std::function<bool(const EventIdentification&)>& wanted) {
    std::vector<std::pair<const Recording*, EventIdentification*>> work;
    for (RecordingIdentification& recording : recordings)
        for (EventIdentification& event : recording.events)
            if (wanted(event)) work.emplace_back(&recording.recording, &event);
    for_each_index(work.size(), options.jobs, [&](std::size_t i) {
        const Event event = work[i].second->event;
        *work[i].second = identify_event(*work[i].first, event, options.identify);
        note_open_intervals(*work[i].second);
    });
}

/// Where a damping law makes the damping ratio depend on amplitude, releases are comparable only at one
/// amplitude: the middle one of those that the releases would have chosen.
std::optional<double> common_amplitude(const std::vector<RecordingIdentification>& recordings) {
    std::vector<double> amplitudes;
    std::size_t releases = 0;
    bool comparable = true;
    const Recording& first = recordings.front().recording;
    for (const RecordingIdentification& identified : recordings) {
        const Recording& recording = identified.recording;
        releases += identified.events.size();
        comparable = comparable && recording.quantity == first.quantity && recording.scaled == first.scaled;
        for (const EventIdentification& event : identified.events)
            if (event.curve_fit.at_amplitude) amplitudes.push_back(*event.curve_fit.at_amplitude);
    }
    if (amplitudes.empty() || releases < 2 || !comparable) return std::nullopt;
    const auto middle = amplitudes.begin() + static_cast<std::ptrdiff_t>(amplitudes.size() / 2);
    std::nth_element(amplitudes.begin(), middle, amplitudes.end());
    return *middle;
}

void state_at_one_amplitude(std::vector<RecordingIdentification>& recordings,
                            const AnalysisOptions& options) {
    if (options.identify.at_amplitude || recordings.empty()) return;
    const std::optional<double> amplitude = common_amplitude(recordings);
    if (!amplitude) return;
    AnalysisOptions again = options;
    again.identify.at_amplitude = amplitude;
    identify_all(recordings, again, [&](const EventIdentification& event) {
        return event.curve_fit.at_amplitude.has_value() && *event.curve_fit.at_amplitude != *amplitude;
    });
}

AnalysisOptions with_gravity(AnalysisOptions options) {
    options.identify.gravity = analysis::gravity_of(options);
    return options;
}

void release_samples(std::vector<RecordingIdentification>& recordings) {
    for (RecordingIdentification& recording : recordings) {
        recording.recording.samples = {};
    }
}

}  // namespace

Identification identify(std::vector<RecordingInput> recordings, const AnalysisOptions& options) {
    Identification identification;
    identification.confidence_level = options.identify.confidence_level;
    identification.article = options.article;
    for (RecordingInput& recording : recordings)
        identification.recordings.push_back(search(std::move(recording), options.event));
    const AnalysisOptions located = with_gravity(options);
    identify_all(identification.recordings, located, [](const EventIdentification&) { return true; });
    state_at_one_amplitude(identification.recordings, located);
    identification.result = analysis::combine(identification.recordings, options);
    if (!options.keep_samples) release_samples(identification.recordings);
    return identification;
}

}  // namespace ringwright
