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
/// Whether a second ringing decay explains most of what the first leaves over its first three cycles, up to
/// `limit`: then it becomes the start's companion, and noise_rms what both leave.
bool explained_by_two(const Pyramid& pyramid, Start& start, std::size_t limit);

/// Takes a start whose decay does not ring, or leaves much unexplained, for what an AC-coupled displacement
/// sensor makes of a release from a hold: a ring on the sensor's slow tail. False, and nothing done, where
/// that leaves not plainly less of the recording unexplained.
bool rings_on_a_tail(const Pyramid& pyramid, const Onset& onset, Start& start, const StartLimits& limits);

}  // namespace ringwright::event_search
