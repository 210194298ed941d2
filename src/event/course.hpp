#pragma once
// How a decay goes on after its start: down to the noise, and on until something disturbs it.

#include <optional>

#include "event/start.hpp"
#include "event/two_terms.hpp"

namespace ringwright::event_search {

/// Positions of the series; see Event for the meaning of end and rest_end.
struct Course {
    std::size_t end = 0, rest_end = 0;
    double fall = 0.0;              ///< of ln amplitude over the decay
    double fall_uncertainty = 0.0;  ///< standard uncertainty of it
    double floor = 0.0;  ///< amplitude of the noise in the band of the mode; 0 when it is not reached
    bool reaches_noise = false;
    double scatter = 0.0;  ///< of ln amplitude about a straight course
    [[nodiscard]] bool falls() const {
        return fall > 0.03 && fall > 4.0 * fall_uncertainty && (scatter < 0.3 || fall > 3.5 * scatter);
    }
};

/// Follows the decay from its start to `limit` at most.
[[nodiscard]] Course follow_decay(const Pyramid& pyramid, const Start& start, std::size_t limit);
/// The same of two modes that beat, with their shapes per block of start.level, beat by beat. Nothing when
/// fewer than one and a half beats lie before the limit.
[[nodiscard]] std::optional<Course> follow_beat(const Pyramid& pyramid, const Start& start,
                                                const TwoTermFit& pair, std::size_t limit);

}  // namespace ringwright::event_search
