#pragma once
// What of the recording's health shows only once a decay is known.

#include <optional>
#include <span>

#include "ringwright/finding.hpp"

namespace ringwright::event_search {

/// "too_low_sampling_rate" below eight samples a cycle, a defect below four.
[[nodiscard]] std::optional<Finding> sampling_finding(double samples_per_cycle);

/// "mains_hum" where a line at 50 or 60 Hz takes at least a third of the variance of what is left after the
/// decay. Nothing when the mode itself (cycles a sample) lies within a tenth of that line, or when the rest
/// is shorter than five periods of it.
[[nodiscard]] std::optional<Finding> hum_finding(std::span<const double> rest, double rate_hz,
                                                 double mode_cycles_per_sample);

}  // namespace ringwright::event_search
