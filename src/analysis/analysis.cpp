#include "ringwright/analysis.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <functional>
#include <optional>
#include <utility>

#include "analysis/long_events.hpp"
#include "analysis/result.hpp"
#include "analysis/series.hpp"
#include "ringwright/each_index.hpp"

namespace ringwright {
namespace {

using Stretches = std::shared_ptr<const LongRecording>;

RecordingIdentification search(RecordingInput input, const AnalysisOptions& options) {
    RecordingIdentification result;
    const Stretches& stretches = input.stretches;
    EventOptions wanted = options.event;
    wanted.threads = threads_for(options.jobs);
    EventSearch found = stretches ? find_events(*stretches, wanted) : find_events(input.recording, wanted);
    result.sample_count = stretches ? stretches->size() : input.recording.size();
    result.duration_s = stretches ? stretches->duration_s() : input.recording.duration_s();
    result.findings = input.recording.findings;
    result.findings.insert(result.findings.end(), found.findings.begin(), found.findings.end());
    result.reason = std::move(found.reason);
    result.added_mass = std::move(input.added_mass);
    result.recording = stretches && options.keep_samples ? stretches->overview() : std::move(input.recording);
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

/// What is analysed, and where the samples are that are not held.
struct Series {
    std::vector<RecordingIdentification> recordings;
    std::vector<Stretches> stretches;  ///< one for each recording; empty where its samples are held
};

struct Work {
    const Recording* recording = nullptr;
    const LongRecording* stretches = nullptr;
    EventIdentification* event = nullptr;
};

void identify_all(Series& series, const AnalysisOptions& options,
                  const std::function<bool(const EventIdentification&)>& wanted) {
    std::vector<Work> work;
    for (std::size_t i = 0; i < series.recordings.size(); ++i)
        for (EventIdentification& event : series.recordings[i].events)
            if (wanted(event))
                work.push_back({&series.recordings[i].recording, series.stretches[i].get(), &event});
    if (work.empty()) return;
    const unsigned threads = threads_for(options.jobs);
    IdentifyOptions each = options.identify;
    each.threads = std::max(1U, threads / static_cast<unsigned>(work.size()));
    for_each_index(work.size(), threads, [&](std::size_t i, unsigned) {
        const Event event = work[i].event->event;
        *work[i].event = work[i].stretches != nullptr
                             ? analysis::identify_within(*work[i].stretches, event, each)
                             : identify_event(*work[i].recording, event, each);
        note_open_intervals(*work[i].event);
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

void state_at_one_amplitude(Series& series, const AnalysisOptions& options) {
    if (options.identify.at_amplitude || series.recordings.empty()) return;
    const std::optional<double> amplitude = common_amplitude(series.recordings);
    if (!amplitude) return;
    AnalysisOptions again = options;
    again.identify.at_amplitude = amplitude;
    identify_all(series, again, [&](const EventIdentification& event) {
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
    Series series;
    for (RecordingInput& recording : recordings) {
        series.stretches.push_back(recording.stretches);
        series.recordings.push_back(search(std::move(recording), options));
    }
    const AnalysisOptions located = with_gravity(options);
    identify_all(series, located, [](const EventIdentification&) { return true; });
    state_at_one_amplitude(series, located);
    identification.recordings = std::move(series.recordings);
    identification.result = analysis::combine(identification.recordings, options);
    if (!options.keep_samples) release_samples(identification.recordings);
    return identification;
}

}  // namespace ringwright
