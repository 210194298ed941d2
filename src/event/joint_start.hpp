#pragma once
// The start of a decay beside which another one dies away.

#include <optional>

#include "event/start.hpp"

namespace ringwright::event_search {

/// Where motion precedes the start, goes back to the first position from which two decays together explain
/// the recording as well as one explains what follows the start: another mode that rings along, or the slow
/// answer of an AC-coupled sensor. Leaves a start alone that is preceded by rest, or by what two decays do
/// not explain either (a second hit).
void go_back_jointly(const Pyramid& pyramid, Start& start, const StartLimits& limits);

}  // namespace ringwright::event_search
