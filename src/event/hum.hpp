#pragma once
// Mains hum that runs through the whole recording.

#include <optional>
#include <span>
#include <vector>

namespace ringwright::event_search {

struct Cleaned {
    std::vector<double> values;
    std::vector<double> lines_hz;  ///< taken out
};

/// The values less the lines of mains hum (50 and 60 Hz, each within 0.5 Hz) that run steadily from the first
/// value to the last: amplitude within 10 % and phase straight in most of the recording, five times what
/// stands beside the line. Nothing where there is none, so that a mode at the line, which dies away, stays.
[[nodiscard]] std::optional<Cleaned> without_hum(std::span<const double> values, double rate_hz,
                                                 unsigned threads = 1);

}  // namespace ringwright::event_search
