#pragma once
// Drops told, or told better, from hold, fall, bounces and last contact as one motion (drop_motion.hpp).

#include <optional>

#include "event/found.hpp"

namespace ringwright::event_search {

/// Where a drop is looked for, in positions of a displacement in m.
struct WholeDropLimits {
    std::size_t earliest = 0, latest = 0;
    double rate_hz = 0.0;
    bool said = false;  ///< the user says that the article was dropped
};

/// What a decay that passes for a pluck's may be.
struct DropBehind {
    std::optional<Found> drop;
    bool undecided = false;  ///< a drop and a release explain the recording about equally well
};

/// The drop that explains hold and decay plainly better than a release from the hold does, and leaves no more
/// than the noise: one whose fall noise hides. None where its fall would be seen by itself.
[[nodiscard]] DropBehind drop_behind(const Pyramid& pyramid, const Found& pluck,
                                     const WholeDropLimits& limits);

/// What passes for a fall.
struct SeenFall {
    /// The drop with flights and last contact as the whole motion has them; none where that leaves more than
    /// noise.
    std::optional<Found> drop;
    bool slow_release = false;  ///< no fall, but the hand that let go, explains the recording
};

/// A drop whose fall was seen, again as a whole: bounces in noise are told by what goes before and after
/// them. `decay` is a decay found after the fall, sure or not.
[[nodiscard]] SeenFall drop_as_whole(const Pyramid& pyramid, const Fall& fall, const Found& decay,
                                     const WholeDropLimits& limits);

}  // namespace ringwright::event_search
