#pragma once
// One made-up figure of each kind, without random numbers from outside: the same on every machine.

#include <vector>

#include "ringwright/figures.hpp"

namespace ringwright::samples {

/// A decay at 4.2 Hz with a damping ratio of 0.045, in mm, with a little noise; `rate_hz` samples a second.
[[nodiscard]] DecayFigure decay(double rate_hz, double duration_s, double frequency_hz = 4.2);
/// A figure of every kind, named.
[[nodiscard]] std::vector<NamedFigure> one_of_each();

}  // namespace ringwright::samples
