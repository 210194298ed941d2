#pragma once
// The search of a recording that is too long to be held, stretch by stretch.

#include <optional>
#include <string>
#include <vector>

#include "event/found.hpp"
#include "ringwright/event.hpp"
#include "ringwright/long_recording.hpp"

namespace ringwright::event_search {

/// A decay that was found in a stretch, and what becomes of it; both count samples from the stretch's first.
struct Candidate {
    Found found;
    Event event;
    double noise_in_rest = 0.0;  ///< rms of single values; 0: there is no rest
};

/// What a stretch shows.
struct SearchedStretch {
    std::vector<Candidate> candidates;  ///< in order
    std::optional<Finding> hum;         ///< in the rest after the first of them
    bool steady = false;                ///< something rang and did not fall
    double mains_hz = 0.0;              ///< hum that passed for a decay; 0: none
    bool settles = false;               ///< a displacement goes to another level, and nothing was let go
    std::string refused;                ///< why the first fall that was seen is no drop; empty without one
};

[[nodiscard]] SearchedStretch search_stretch(const Recording& recording, const EventOptions& options);

/// Leaves out what does not move like the strongest of them, or is too weak beside it.
void drop_unlike_others(std::vector<Candidate>& candidates);

/// Why there is no event.
[[nodiscard]] std::string reason_for_none(const SearchedStretch& searched);

/// That the motion before this time, since the start of the recording, is not part of the decay.
[[nodiscard]] Finding double_hit(double time_s);

[[nodiscard]] EventSearch search_long(const LongRecording& recording, const EventOptions& options);
/// The decay in a window that the user gave. Throws UsageError as search_by_hand does, and where the window
/// is longer than a stretch.
[[nodiscard]] EventSearch search_long_by_hand(const LongRecording& recording, const EventOptions& options);

}  // namespace ringwright::event_search
