#pragma once
// How clearly a channel shows an event, for the choice of a channel that nobody named.

#include <cstddef>
#include <vector>

namespace ringwright {

/// Loudness of the loudest stretch over the noise between samples, times its loudness over that of the usual
/// stretch; 0 for a constant or an empty channel. Each stretch is taken without its own straight line, so
/// that a drift counts for nothing. Missing values are NaN.
[[nodiscard]] double signal_clarity(const std::vector<double>& samples);

/// Clarity of a channel and its range from lowest to highest value.
struct ChannelMerit {
    double clarity = 0.0;
    double range = 0.0;
};
[[nodiscard]] ChannelMerit merit_of(const std::vector<double>& samples);
/// The channel to take: the clearest, each clarity weighed with the range where all are in one unit. The
/// first of several that are nearly alike. Precondition: not empty.
[[nodiscard]] std::size_t best_channel(const std::vector<ChannelMerit>& merits, bool one_unit);

}  // namespace ringwright
