#pragma once
// A release from a hold as an AC-coupled displacement sensor shows it: a ring on the sensor's slow tail.

#include <cstddef>
#include <optional>
#include <span>

#include "event/decay_shape.hpp"

namespace ringwright::event_search {

/// offset + A·h(t) + D·e^(−βt), t from the moment of release. A first-order high-pass of corner β makes of a
/// hold e^(−βt), so h = e^(−βt) before the release; a mass released at rest leaves the hold with the same
/// value and slope, so h = e^(−st)[C + (s − β)·S] after it.
struct CoupledRelease {
    double moment = 0.0;                                    ///< steps from the first point
    DecayShape ring;                                        ///< per step
    double tail_rate = 0.0;                                 ///< β, 1/step
    double offset = 0.0, ring_part = 0.0, tail_part = 0.0;  ///< offset, A, D
    double residual_sum = 0.0;                              ///< of squares
    std::size_t points = 0;
    [[nodiscard]] double residual_rms() const;
    [[nodiscard]] double ring_amplitude() const;
};

/// By least squares, offset and amplitudes eliminated, from tails of 1/40 to 1/2 of the ring's angular
/// frequency and moments in [earliest, latest]. Nothing with fewer than 24 points or for a constant.
[[nodiscard]] std::optional<CoupledRelease> fit_coupled_release(std::span<const double> points,
                                                                const DecayShape& ring, double earliest,
                                                                double latest);

}  // namespace ringwright::event_search
