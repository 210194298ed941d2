#pragma once
// The first sample of free decay, and the decay that follows it.

#include <optional>

#include "event/onset.hpp"

namespace ringwright::event_search {

/// A decay and where it starts, in positions of the series.
struct Start {
    std::size_t position = 0;  ///< first of free decay
    DecayShape shape;          ///< per step of the series
    std::size_t level = 0;     ///< on which `fit` was made: 12 to 24 blocks a cycle where the sampling allows
    std::size_t fit_block = 0;
    DecayFit fit;                         ///< of the blocks from `fit_block` on
    double amplitude = 0.0;               ///< of the decay at `position`
    double noise_rms = 0.0;               ///< of single values about the decay
    std::optional<DecayShape> companion;  ///< another mode that rings along; per step of the series
    bool from_rest = false;               ///< a held plateau precedes it, and it leaves the plateau at rest
};

struct StartLimits {
    std::size_t earliest = 0;  ///< the start is not before this position (clipping, the event before)
    std::size_t latest = 0;    ///< the decay is not looked at beyond this position (the event after)
    bool displacement = true;  ///< a release from rest leaves a plateau quadratically
    bool drop = false;  ///< bounces may come first: they are nearly a decay, and must not be taken for it
    std::optional<SampleRange> rest;  ///< positions that show the noise alone, once they are known
};

/// What the rest after the decay shows on one level.
struct RestNoise {
    double variance = 0.0;     ///< of one block, about a straight line
    double independent = 0.0;  ///< number of blocks over their correlation length
    [[nodiscard]] bool is_long() const { return independent >= 30.0; }
};

/// Nothing when the rest is too short.
[[nodiscard]] std::optional<RestNoise> noise_of_rest(std::span<const double> means, std::size_t level,
                                                     const std::optional<SampleRange>& rest);

/// Refines the start of an onset. The samples that one free decay explains, as far back as it does.
[[nodiscard]] std::optional<Start> locate_start(const Pyramid& pyramid, const Onset& onset,
                                                const StartLimits& limits);

}  // namespace ringwright::event_search
