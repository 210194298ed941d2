#pragma once
// The frequency at which a decay rings, from its periodogram.

#include <optional>
#include <span>
#include <vector>

#include "event/found.hpp"

namespace ringwright::event_search {

/// |Σ y e^(−iωt)|² at k·rate/(2·(size−1)) of the points less their mean, zero-padded to at least four times
/// their number.
struct Periodogram {
    std::vector<double> power;
    double step_hz = 0.0;
};
[[nodiscard]] Periodogram periodogram_of(std::span<const double> points, double rate_hz);

/// Hz of the strongest line of the decay, or of the strongest within a quarter of `near_hz`; 0 when the decay
/// does not ring.
[[nodiscard]] double ringing_frequency(const Pyramid& pyramid, double rate_hz, const Found& found,
                                       const std::optional<double>& near_hz);

}  // namespace ringwright::event_search
