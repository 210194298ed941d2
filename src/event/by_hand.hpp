#pragma once
// A window that the user gave.

#include "ringwright/event.hpp"

namespace ringwright::event_search {

/// The decay in the window of options.from_s and options.to_s, whichever is given. Throws UsageError when the
/// window lies outside the recording or holds fewer than eight samples.
[[nodiscard]] EventSearch search_by_hand(const Recording& recording, const EventOptions& options);

}  // namespace ringwright::event_search
