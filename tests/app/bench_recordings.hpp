#pragma once
// Recordings of known truth as CSV text.

#include <fmt/format.h>

#include <cmath>
#include <numbers>
#include <string>

#include "support/draws.hpp"

namespace ringwright::test {

/// One release at 0.5 s of an article of 5 Hz, sampled at 500 Hz for 3 s, in mm with white noise of 0.02 mm.
inline std::string pluck_csv(double damping_ratio, std::uint64_t seed, double frequency_hz = 5.0) {
    Draws draws(seed);
    const double omega = 2.0 * std::numbers::pi * frequency_hz;
    const double damped = omega * std::sqrt(1.0 - damping_ratio * damping_ratio);
    const double decay = damping_ratio * omega;
    std::string text = "time (s),displacement (mm)\n";
    for (int i = 0; i < 1500; ++i) {
        const double t = i / 500.0 - 0.5;
        double value = 0.0;
        // Pulled aside by 5 mm and let go.
        if (t >= 0.0)
            value =
                5.0 * std::exp(-decay * t) * (std::cos(damped * t) + decay / damped * std::sin(damped * t));
        else if (t > -0.3)
            value = 5.0 * std::min(1.0, (t + 0.3) / 0.2);
        text += fmt::format("{:.4f},{:.5f}\n", t + 0.5, value + 0.02 * draws.normal());
    }
    return text;
}

}  // namespace ringwright::test
