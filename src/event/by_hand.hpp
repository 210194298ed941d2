#pragma once
// A window that the user gave.

#include <cstddef>
#include <functional>

#include "ringwright/event.hpp"

namespace ringwright::event_search {

/// The decay in the window of options.from_s and options.to_s, whichever is given. Throws UsageError when the
/// window lies outside the recording or holds fewer than eight samples.
[[nodiscard]] EventSearch search_by_hand(const Recording& recording, const EventOptions& options);

/// What a window is cut from.
struct WholeSpan {
    std::size_t size = 0;
    double start_s = 0.0, end_s = 0.0;  ///< of the first and the last sample
    std::function<std::size_t(double)> sample_at;
};
/// The samples of the window; throws as search_by_hand does.
[[nodiscard]] SampleRange window_of(const WholeSpan& whole, const EventOptions& options);
/// The decay in these samples; `start_s` is when the recording begins that they are part of.
[[nodiscard]] EventSearch search_window(const Recording& recording, SampleRange window,
                                        const EventOptions& options, double start_s);

}  // namespace ringwright::event_search
