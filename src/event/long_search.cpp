#include "event/long_search.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <utility>

#include "event/by_hand.hpp"
#include "ringwright/error.hpp"

namespace ringwright::event_search {
namespace {

/// Moves by as many samples.
Event moved(Event event, std::size_t by) {
    for (std::size_t* place :
         {&event.quiet_begin, &event.quiet_end, &event.begin, &event.end, &event.rest_end})
        *place += by;
    for (SampleRange& flight : event.flights) flight = {flight.begin + by, flight.end + by};
    return event;
}

/// First sample of the test: of the fall, or of the decay.
std::size_t since(const Event& event) {
    return event.flights.empty() ? event.begin : std::min(event.begin, event.flights.front().begin);
}

/// Goes through the stretches. What it accepts counts samples from the first of the recording.
class LongSearch {
  public:
    LongSearch(const LongRecording& recording, const EventOptions& options)
        : recording_(recording),
          options_(options),
          share_(std::max<std::size_t>(recording.limits().stretch / 8, 1)) {}

    EventSearch run() {
        for (std::size_t begin = 0; begin < recording_.size(); begin = next_) {
            end_ = std::min(recording_.size(), begin + 8 * share_);
            search_from(begin);
            if (options_.progress)
                options_.progress(static_cast<double>(end_) / static_cast<double>(recording_.size()));
        }
        return result();
    }

  private:
    [[nodiscard]] bool last() const { return end_ == recording_.size(); }

    /// Events that begin in the last eighth are left to the next stretch, which sees another eighth before
    /// them.
    void search_from(std::size_t begin) {
        SearchedStretch searched = search_stretch(recording_.stretch({begin, end_}), options_);
        seen_.steady = seen_.steady || searched.steady;
        seen_.mains_hz = std::max(seen_.mains_hz, searched.mains_hz);
        seen_.settles = seen_.settles || searched.settles;
        if (seen_.refused.empty()) seen_.refused = searched.refused;
        std::size_t hand_over = last() ? end_ : end_ - share_;
        next_ = last() ? end_ : hand_over - share_;
        for (Candidate& candidate : searched.candidates) {
            candidate.event = moved(std::move(candidate.event), begin);
            if (is_known(candidate)) continue;
            if (since(candidate.event) >= hand_over && !last()) break;
            bool cut = false;
            if (unfinished(candidate.event)) {
                const std::size_t start = since(candidate.event) - std::min(since(candidate.event), share_);
                if (start > begin + share_ / 4) {
                    next_ = start;
                    hand_over = since(candidate.event);
                    break;
                }
                cut = note_cut(candidate);
            }
            accept(std::move(candidate), begin);
            cut_ = cut;
            if (!hum_ && searched.hum) hum_ = searched.hum;
        }
        handed_over_ = hand_over;
    }

    /// Part of what an earlier stretch accepted, or decided against.
    bool is_known(const Candidate& candidate) {
        const Event& event = candidate.event;
        const double cycle = candidate.found.cycle();
        if (event.begin < taken_until_) {
            // A decay longer than a stretch goes on here.
            if (cut_) taken_until_ = std::max(taken_until_, event.end);
            return true;
        }
        return static_cast<double>(event.begin) + 2.0 * cycle < static_cast<double>(handed_over_);
    }

    /// Whether the end of the stretch cuts what the fit may want of the decay and the noise after it.
    [[nodiscard]] bool unfinished(const Event& event) const {
        constexpr std::size_t least_rest = 2000;
        if (last() || event.rest_end < end_) return false;
        return event.end + std::max(event.end - event.begin, least_rest) > end_;
    }

    /// Whether the decay itself is cut, not only the noise after it.
    [[nodiscard]] bool note_cut(Candidate& candidate) const {
        if (candidate.found.course.reaches_noise) return false;
        candidate.event.findings.push_back(
            {"longer_than_a_stretch", Severity::caution,
             fmt::format("The decay is longer than the {} samples that are looked at together in a recording "
                         "of this length; its first part alone was used. To see all of it, cut the recording "
                         "before and after it, or record fewer samples a second.",
                         recording_.limits().stretch)});
        return true;
    }

    void accept(Candidate candidate, std::size_t begin) {
        Event& event = candidate.event;
        for (Finding& finding : event.findings)
            if (finding.code == "double_hit")
                finding =
                    double_hit(static_cast<double>(event.begin) / recording_.facts().clock.sample_rate_hz);
        if (event.quiet_begin == begin && !accepted_.empty()) join_quiet(accepted_.back().event, event);
        taken_until_ = event.end;
        rest_open_ = event.rest_end == end_ && !last();
        accepted_.push_back(std::move(candidate));
    }

    /// What is quiet before the first event of a stretch begins with the rest after the event before, and
    /// goes on where no disturbance ended that.
    void join_quiet(const Event& before, Event& event) const {
        event.quiet_begin = before.end;
        if (!rest_open_) event.quiet_end = before.rest_end;
        event.quiet_end = std::max(event.quiet_end, before.end);
    }

    EventSearch result() {
        drop_unlike_others(accepted_);
        EventSearch result;
        for (Candidate& candidate : accepted_) result.events.push_back(std::move(candidate.event));
        if (hum_) result.findings.push_back(*hum_);
        if (result.events.empty()) result.reason = reason_for_none(seen_);
        return result;
    }

    const LongRecording& recording_;
    const EventOptions& options_;
    std::size_t share_;  ///< an eighth of a stretch
    std::size_t end_ = 0, next_ = 0;
    std::size_t handed_over_ = 0;  ///< what begins before it has been decided
    std::size_t taken_until_ = 0;  ///< by the last event
    bool cut_ = false;             ///< the last event goes on beyond its stretch
    bool rest_open_ = false;       ///< so does the noise after it
    std::vector<Candidate> accepted_;
    SearchedStretch seen_;
    std::optional<Finding> hum_;
};

}  // namespace

EventSearch search_long(const LongRecording& recording, const EventOptions& options) {
    return LongSearch(recording, options).run();
}

EventSearch search_long_by_hand(const LongRecording& recording, const EventOptions& options) {
    const double start_s = recording.facts().clock.start_s;
    const WholeSpan whole{recording.size(), start_s, start_s + recording.duration_s(),
                          [&](double time_s) { return recording.sample_at(time_s); }};
    const SampleRange window = window_of(whole, options);
    if (window.end - window.begin > recording.limits().stretch)
        throw UsageError(
            {"--from/--to", "", fmt::format("the window holds {} samples", window.end - window.begin),
             fmt::format("Give one of at most {} samples, or leave it out.", recording.limits().stretch)});
    EventSearch result =
        search_window(recording.stretch(window), {0, window.end - window.begin}, options, start_s);
    for (Event& event : result.events) event = moved(std::move(event), window.begin);
    for (Event& event : result.events) event.quiet_begin = event.quiet_end = 0;
    return result;
}

}  // namespace ringwright::event_search
