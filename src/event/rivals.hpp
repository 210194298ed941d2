#pragma once
// What else a short excursion may be: the path of a hand, a pulse, a wandering of the noise.

#include <optional>
#include <span>
#include <vector>

#include "event/found.hpp"
#include "event/onset.hpp"

namespace ringwright::event_search {

/// Positions of the path of a hand (a straight ramp, half a cosine, a path of least jerk) or of a pulse (half
/// a sine, its square) that explains the recording about a heavily damped decay as well as the decay does.
/// Nothing where the decay does it better, or where noise hides the difference.
[[nodiscard]] std::optional<SampleRange> hand_or_pulse(const Pyramid& pyramid, const Found& found);

/// Whether what was found does not ring, or is over within two cycles.
[[nodiscard]] bool shows_one_swing(const Found& found);

/// Whether what was found in a displacement record shows one swing, and is only a part of a way down: since
/// it last was at rest the article was plainly farther away than at the start of the decay; or it never was
/// at rest before, and goes on to lie as far on the other side until the end. A hand, a jack or creep lowers
/// so; whoever releases holds, and lets go from there.
[[nodiscard]] bool comes_down(const Pyramid& pyramid, const Found& found);

/// Whether what was found is over within two cycles, and what lies about it rings on longer, not much weaker:
/// then it is the blow itself, or a corner of the path before the release.
[[nodiscard]] bool is_outlived(const Pyramid& pyramid, const Found& found, const std::vector<Onset>& onsets);

/// Whether what was found is over within three cycles.
[[nodiscard]] bool is_brief(const Found& found);

/// How often the swing of the decay exceeds what the rest of the recording does within the same time: against
/// the upper quartile of the swings outside all the decays found (of one that is not brief, before the first
/// of them, ten cycles at least) and outside what is left out. Large when there is no rest to speak of.
[[nodiscard]] double swing_against_elsewhere(const Pyramid& pyramid, const Found& found,
                                             const std::vector<Found>& all,
                                             const std::vector<SampleRange>& left_out);

}  // namespace ringwright::event_search
