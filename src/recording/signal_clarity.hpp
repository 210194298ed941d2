#pragma once
// How clearly a channel shows an event, for the choice of a channel that nobody named.

#include <vector>

namespace ringwright {

/// Loudness of the loudest stretch over the noise between samples, times its loudness over that of the usual
/// stretch; 0 for a constant or an empty channel. Each stretch is taken without its own straight line, so
/// that a drift counts for nothing. Missing values are NaN.
[[nodiscard]] double signal_clarity(const std::vector<double>& samples);

}  // namespace ringwright
