#include "analysis/long_events.hpp"

#include <algorithm>
#include <cmath>

namespace ringwright::analysis {
namespace {

/// Twice the decay before it (the quiet stretch is as long as the decay, and a plateau may lie between), once
/// the decay after it; more where the decay is short.
SampleRange reach_of(const LongRecording& recording, const Event& event) {
    constexpr std::size_t least = 4000;
    constexpr double cycles = 20.0;
    const std::size_t decay = event.end - event.begin;
    const double cycle = event.frequency_guess_hz > 0.0
                             ? recording.facts().clock.sample_rate_hz / event.frequency_guess_hz
                             : 0.0;
    const std::size_t wanted = std::max(least, static_cast<std::size_t>(cycles * std::min(cycle, 1e9)));
    const std::size_t since =
        event.flights.empty() ? event.begin : std::min(event.begin, event.flights.front().begin);
    const std::size_t before = std::min(std::max(2 * decay, wanted), recording.limits().stretch);
    const std::size_t after = std::max(decay, wanted);
    return {since - std::min(since, before),
            std::min({recording.size(), event.end + after, std::max(event.rest_end, event.end + 1)})};
}

Event seen_from(Event event, SampleRange reach) {
    const auto place = [&](std::size_t sample) {
        return std::clamp(sample, reach.begin, reach.end) - reach.begin;
    };
    for (std::size_t* sample :
         {&event.quiet_begin, &event.quiet_end, &event.begin, &event.end, &event.rest_end})
        *sample = place(*sample);
    for (SampleRange& flight : event.flights) flight = {place(flight.begin), place(flight.end)};
    return event;
}

}  // namespace

EventIdentification identify_within(const LongRecording& recording, const Event& event,
                                    const IdentifyOptions& options) {
    const SampleRange reach = reach_of(recording, event);
    EventIdentification result = identify_event(recording.stretch(reach), seen_from(event, reach), options);
    Event& found = result.event;  // its beginning may have moved
    const std::size_t begin = found.begin + reach.begin;
    found = event;
    found.begin = begin;
    return result;
}

}  // namespace ringwright::analysis
