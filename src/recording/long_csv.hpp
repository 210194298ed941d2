#pragma once
// Long text tables, read a stretch at a time.

#include <memory>

#include "recording/input_bytes.hpp"
#include "ringwright/long_recording.hpp"

namespace ringwright {

/// About how many rows a text has, from the length of lines in its middle.
[[nodiscard]] std::size_t rows_estimate(std::string_view text);

/// `facts` has the origin's file and bytes. See open_long_recording.
[[nodiscard]] std::unique_ptr<LongRecording> open_long_csv(std::shared_ptr<const InputBytes> input,
                                                           const ReadOptions& options, Recording facts,
                                                           const LongLimits& limits);

}  // namespace ringwright
