#pragma once
// A release from rest: the moment at which a held plateau turns into free decay.

#include "event/start.hpp"

namespace ringwright::event_search {

/// Where a flat stretch precedes the start, moves it to the likeliest moment of release: displacement is
/// plateau before τ and offset + (plateau − offset)·e^(−s(t−τ))[C + s·S] after it, continuous with its
/// velocity. Leaves the start alone where no plateau is seen or where this explains the samples worse.
void refine_release(const Pyramid& pyramid, Start& start, const StartLimits& limits);

}  // namespace ringwright::event_search
