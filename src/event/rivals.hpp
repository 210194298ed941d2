#pragma once
// What else a short excursion may be: the path of a hand, a pulse, a wandering of the noise.

#include <span>
#include <vector>

#include "event/found.hpp"
#include "event/onset.hpp"

namespace ringwright::event_search {

/// Whether the path of a hand (a straight ramp, half a cosine, a path of least jerk) or a pulse (half a sine,
/// its square) explains the recording about a heavily damped decay better than the decay does.
[[nodiscard]] bool is_hand_or_pulse(const Pyramid& pyramid, const Found& found);

/// Whether what was found is over within two cycles, and what lies about it rings on longer, not much weaker:
/// then it is the blow itself, or a corner of the path before the release.
[[nodiscard]] bool is_outlived(const Pyramid& pyramid, const Found& found, const std::vector<Onset>& onsets);

/// How often the swing of the decay exceeds what the rest of the recording does within the same time: against
/// the upper quartile of the swings outside all the decays found. Large when there is no rest to speak of.
[[nodiscard]] double swing_against_elsewhere(const Pyramid& pyramid, const Found& found,
                                             const std::vector<Found>& all);

}  // namespace ringwright::event_search
