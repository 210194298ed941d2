#pragma once
// An event of a recording whose samples are not held.

#include "ringwright/identify.hpp"
#include "ringwright/long_recording.hpp"

namespace ringwright::analysis {

/// identify_event on the samples that the methods may want: the decay, and quiet before and after it. Throws
/// InputError as LongRecording::stretch does.
[[nodiscard]] EventIdentification identify_within(const LongRecording& recording, const Event& event,
                                                  const IdentifyOptions& options);

}  // namespace ringwright::analysis
