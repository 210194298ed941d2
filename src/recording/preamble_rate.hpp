#pragma once
// The sampling rate as the lines above a table state it.

#include <optional>
#include <string_view>

namespace ringwright {

struct StatedRate {
    double rate_hz = 0.0;
    std::string_view line;
};

/// Finds "Sample rate: 2000 Hz", "Abtastrate;2,0;kHz", "Sample interval (ms) = 0.5" and the like.
[[nodiscard]] std::optional<StatedRate> rate_in_preamble(std::string_view preamble);

}  // namespace ringwright
