#pragma once
// Two close modes that beat: the envelope's minimum is no end, and the rise after it no second hit.

#include <optional>

#include "event/start.hpp"
#include "event/two_terms.hpp"

namespace ringwright::event_search {

/// Two decays that together explain the recording from `start` over at least one beat, where one alone leaves
/// most of it; shapes per block of start.level, t = 0 at the first block that lies after the start. The
/// stronger is `first`. Nothing when the modes lie closer than either is wide at half power, or farther apart
/// than a third of their frequency.
[[nodiscard]] std::optional<TwoTermFit> find_beat(const Pyramid& pyramid, const Start& start,
                                                  std::size_t limit);
/// Blocks of one beat.
[[nodiscard]] double beat_length(const TwoTermFit& pair);

}  // namespace ringwright::event_search
