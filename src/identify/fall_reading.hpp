#pragma once
// What readings of a fall share, whatever the sensor.

#include <string>

#include "identify/drop_reading.hpp"

namespace ringwright::identify {

/// ω, ζ and rest level of the decay, as the motion after first touch needs them.
struct Support {
    double angular_frequency = 0.0, damping_ratio = 0.0, level = 0.0;
    /// Distance from the rest position t after a start at x with velocity v (s after, m, m/s).
    [[nodiscard]] double motion(double x, double v, double t) const;
};

/// The estimate with Student's t for the degrees of freedom.
[[nodiscard]] Estimate estimate_of_reading(double value, double deviation, double degrees_of_freedom,
                                           double confidence);

/// Whether a ratio differs from 1 by a hundredth and by more than noise would make it once in a thousand.
[[nodiscard]] bool disagrees(double ratio, double deviation, double degrees_of_freedom);

/// "5.0 % more" for 0.05.
[[nodiscard]] std::string percent(double share);

/// "fall_disagrees_with_gravity": `what` says how `seen`, m/s², was seen.
[[nodiscard]] Finding fall_finding(double seen, double gravity, const char* what);

/// The reading of an accelerometer (drop_reading.hpp).
[[nodiscard]] DropReading read_acceleration(const Recording& recording, const Event& event,
                                            const RestingDecay& decay, const Gravity& gravity,
                                            double confidence_level);

}  // namespace ringwright::identify
