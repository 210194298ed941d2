#pragma once
// Recordings as sound files, through libsndfile.

#include <string_view>

#include "ringwright/recording.hpp"

namespace ringwright {

/// True when the bytes begin like a sound file (WAV, RF64, W64, AIFF, FLAC, CAF, AU, Ogg).
[[nodiscard]] bool is_sound(std::string_view bytes);
/// Fills `recording` from one track. A header that claims more than the file holds is not believed: the file
/// is read as far as its bytes go. Throws InputError when it cannot be decoded or is too short, UsageError
/// for an unusable option.
void read_sound(std::string_view bytes, const ReadOptions& options, Recording& recording);
void summarise_sound(std::string_view bytes, const ReadOptions& options, FileSummary& summary);

}  // namespace ringwright
