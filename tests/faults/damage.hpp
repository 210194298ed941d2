#pragma once
// Damaged recordings: what a memory stick, a broken logger or an editor makes of good ones.

#include <cstdint>
#include <string>

namespace ringwright::test {

struct DamagedFile {
    std::string bytes;
    std::string kind;    ///< how it was damaged, for messages
    std::string ending;  ///< ".csv" or ".wav"
};

/// The same seed makes the same file. Half of them text, half sound; a third is damaged twice.
[[nodiscard]] DamagedFile damaged_file(std::uint64_t seed);

/// A WAV file of 16-bit samples with these claims in its header and `frames` frames behind it.
struct WavClaims {
    std::uint16_t format = 1, channels = 1, block_align = 2, bits = 16;
    std::uint32_t rate = 8000, data_bytes = 0;
};
[[nodiscard]] std::string wav_bytes(const WavClaims& claims, std::size_t frames);
/// An RF64 file (EBU Tech 3306) whose ds64 chunk claims this many frames.
[[nodiscard]] std::string rf64_bytes(std::uint64_t claimed_frames, std::size_t frames);

}  // namespace ringwright::test
