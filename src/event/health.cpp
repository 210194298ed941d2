#include "event/health.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <numbers>

namespace ringwright::event_search {
namespace {

/// Share of one line's amplitude in the rest against its own noise; mains at 50 or 60 Hz.
double line_to_noise(std::span<const double> rest, double cycles_per_sample) {
    double cosine = 0.0, sine = 0.0, squares = 0.0, mean = 0.0;
    const auto n = static_cast<double>(rest.size());
    for (const double y : rest) mean += y / n;
    for (std::size_t k = 0; k < rest.size(); ++k) {
        const double angle = 2.0 * std::numbers::pi * cycles_per_sample * static_cast<double>(k);
        cosine += (rest[k] - mean) * std::cos(angle), sine += (rest[k] - mean) * std::sin(angle);
        squares += (rest[k] - mean) * (rest[k] - mean);
    }
    const double explained = 2.0 * (cosine * cosine + sine * sine) / n;
    return squares > 0.0 ? explained / squares : 0.0;
}

}  // namespace

std::optional<Finding> sampling_finding(double samples_per_cycle) {
    if (samples_per_cycle >= 8.0) return {};
    return Finding{"too_low_sampling_rate", samples_per_cycle < 4.0 ? Severity::defect : Severity::caution,
                   fmt::format("There are only {:.1f} samples a cycle. Record at a higher rate: 20 samples "
                               "a cycle or more.",
                               samples_per_cycle)};
}

std::optional<Finding> hum_finding(std::span<const double> rest, double rate_hz,
                                   double mode_cycles_per_sample) {
    constexpr double hum_share = 0.33, fewest_periods = 5.0, highest = 0.45, near_mode = 0.1;
    constexpr std::size_t most = 65536;
    const std::span<const double> seen = rest.first(std::min(rest.size(), most));
    for (const double mains_hz : {50.0, 60.0}) {
        const double line = mains_hz / rate_hz;
        if (line > highest || static_cast<double>(seen.size()) * line < fewest_periods) continue;
        if (std::abs(mode_cycles_per_sample / line - 1.0) < near_mode) continue;
        if (line_to_noise(seen, line) < hum_share) continue;
        return Finding{"mains_hum", Severity::note,
                       fmt::format("Most of the noise after the decay is mains hum at {:.0f} Hz. Check "
                                   "earthing and shielding of the sensor's cable.",
                                   mains_hz)};
    }
    return {};
}

}  // namespace ringwright::event_search
