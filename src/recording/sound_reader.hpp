#pragma once
// Recordings as sound files, through libsndfile.

#include <memory>
#include <string>
#include <string_view>

#include "recording/input_bytes.hpp"
#include "ringwright/long_recording.hpp"
#include "ringwright/recording.hpp"

namespace ringwright {

/// True when the bytes begin like a sound file (WAV, RF64, W64, AIFF, FLAC, CAF, AU, Ogg).
[[nodiscard]] bool is_sound(std::string_view bytes);
/// Fills `recording` from one track. A header that claims more than the file holds is not believed: the file
/// is read as far as its bytes go. Throws InputError when it cannot be decoded or is too short, UsageError
/// for an unusable option.
void read_sound(std::string_view bytes, const ReadOptions& options, Recording& recording);
/// How many frames the file says that it has. Throws InputError when it cannot be decoded.
[[nodiscard]] std::size_t frames_stated(std::string_view bytes, const std::string& file);
/// `facts` has the origin's file and bytes. See open_long_recording.
[[nodiscard]] std::unique_ptr<LongRecording> open_long_sound(std::shared_ptr<const InputBytes> input,
                                                             const ReadOptions& options, Recording facts,
                                                             const LongLimits& limits);
void summarise_sound(std::string_view bytes, const ReadOptions& options, FileSummary& summary);

}  // namespace ringwright
