#pragma once
// What the samples of a long recording say, part by part, without the samples.

#include <cstddef>
#include <span>
#include <vector>

#include "ringwright/long_recording.hpp"

namespace ringwright {

/// Lowest and highest of some neighbouring samples, and which of them came first.
struct Extremes {
    double low = 0.0, high = 0.0;
    bool low_first = true;
};

/// Samples to a pair of extremes.
inline constexpr std::size_t digest_block = 4096;

struct SignalDigest {
    std::size_t count = 0;
    double first = 0.0, last = 0.0;
    double low = 0.0, high = 0.0;
    double smallest_step = 0.0;    ///< between neighbours that differ; 0: none does
    std::vector<Extremes> blocks;  ///< of each `digest_block` samples, the last may be of fewer
};

[[nodiscard]] SignalDigest digest_of(std::span<const double> samples);
/// The digest of both, `later` behind; the blocks stay as they are.
void append(SignalDigest& digest, const SignalDigest& later);

/// Samples from `begin` on.
struct DigestedPart {
    std::size_t begin = 0;
    SignalDigest digest;
};

/// The runs at the rails of a recording with these parts; reads again only parts that touch a rail.
[[nodiscard]] std::vector<SampleRange> clipped_runs(const LongRecording& recording,
                                                    const std::vector<DigestedPart>& parts,
                                                    const SignalDigest& whole);

/// Two samples for each block of the parts, of which each lasts from `begin_s` to `end_s`, behind what
/// `overview` holds.
void add_overview(const SignalDigest& part, double begin_s, double end_s, Recording& overview);

}  // namespace ringwright
