#pragma once
// Where the free decay of a drop begins: after the last stretch in which the spring did not push.

#include <optional>

#include "event/free_fall.hpp"
#include "event/start.hpp"

namespace ringwright::event_search {

/// The decay of the last unbroken contact after `fall`: the earliest from whose start on neither the level of
/// first touch is passed nor spring and damper would have to pull (contact.hpp), as the decay fitted from
/// there has it. Takes out of `fall` what the decay that follows explains as well as a flight does (the crest
/// of a swing). Nothing when no flight is left, or no decay follows.
[[nodiscard]] std::optional<Start> locate_drop_start(const Pyramid& pyramid, Fall& fall,
                                                     MeasuredQuantity quantity, double rate_hz,
                                                     const StartLimits& limits);

/// The decay from a position on at which the mass is known to have touched for good, `shape` a step of the
/// series about as it is. Nothing where too little follows.
[[nodiscard]] std::optional<Start> start_of_contact(const Pyramid& pyramid, std::size_t position,
                                                    const DecayShape& shape, double rate_hz,
                                                    std::size_t latest);

}  // namespace ringwright::event_search
