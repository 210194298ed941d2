#pragma once
// Where something sudden begins, on the time scale on which it is plainest.

#include <optional>
#include <vector>

#include "event/decay_shape.hpp"
#include "event/series.hpp"

namespace ringwright::event_search {

/// A place from which the recording looks like a free decay on one time scale.
struct Onset {
    std::size_t level = 0;     ///< of the pyramid
    std::size_t block = 0;     ///< of that level, just before the change
    std::size_t position = 0;  ///< of the series: block · 2^level
    DecayFit fit;              ///< from `fit_block` on
    std::size_t fit_block = 0;
    double amplitude = 0.0;  ///< of the decay at the start of the fit
    double score = 0.0;
};

/// The decay that begins at or shortly after this block of a level; nothing when none is seen there.
[[nodiscard]] std::optional<Onset> onset_at(const Pyramid& pyramid, std::size_t level, std::size_t block);

/// All of them, best first, each place and scale on its own (one release shows on several scales).
[[nodiscard]] std::vector<Onset> find_onsets(const Pyramid& pyramid, unsigned threads = 1);

}  // namespace ringwright::event_search
