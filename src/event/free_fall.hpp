#pragma once
// Free fall before the ringing of a drop: nothing but gravity acts on the mass.

#include <cstddef>
#include <vector>

#include "event/series.hpp"
#include "ringwright/recording.hpp"

namespace ringwright::event_search {

inline constexpr double standard_gravity =
    9.80665;  ///< m/s² (NIST SP 811, appendix B.8); sites differ by 0.5 %

/// A stretch of free fall, positions of the series.
struct Flight {
    std::size_t begin = 0, end = 0;
    /// m/s², downwards positive: from the curvature of a displacement or the slope of a velocity; standard
    /// gravity for an accelerometer, which shows none.
    double acceleration = 0.0;
    double level = 0.0;  ///< acceleration only: what the sensor shows while nothing holds the mass, m/s²
    double uncertainty = 0.0;  ///< standard uncertainty of `acceleration`, or of gravity as `level` shows it
    double noise = 0.0;        ///< rms about the flight of single blocks of the level on which it was found
};

/// A fall from a hold and the bounces after it, in order. `down` is +1 where a downward motion raises the
/// recorded value, else −1.
struct Fall {
    std::vector<Flight> flights;
    double down = 1.0;
    bool hold_seen = false;  ///< the recording goes back before the release
};

/// Falls from rest in a recording in SI units of a motion along a line: an acceleration within 15 % of
/// standard gravity for 25 ms at least (3 mm), or where an accelerometer falls by that much from a steady
/// level to another and rests there as long. Bounces shorter than that are not in the list. Linear in the
/// length of the recording.
[[nodiscard]] std::vector<Fall> find_falls(const Pyramid& pyramid, double rate_hz, MeasuredQuantity quantity);

}  // namespace ringwright::event_search
