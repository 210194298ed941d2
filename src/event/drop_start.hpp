#pragma once
// Where the free decay of a drop begins: after the last stretch in which the spring did not push.

#include <optional>

#include "event/free_fall.hpp"
#include "event/start.hpp"

namespace ringwright::event_search {

/// The decay after the last flight of `fall`. Spring and damper push and cannot pull, so the mass is free
/// wherever a displacement lies above the level of first touch (the rest position less g/ω_n²), or an
/// accelerometer shows no more than in free fall; the decay begins after the last such place. Takes out of
/// `fall` what the decay that follows explains as well as a flight does (the crest of a swing). Nothing when
/// no flight is left, or no decay follows.
[[nodiscard]] std::optional<Start> locate_drop_start(const Pyramid& pyramid, Fall& fall,
                                                     MeasuredQuantity quantity, double rate_hz,
                                                     const StartLimits& limits);

}  // namespace ringwright::event_search
