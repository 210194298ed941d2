#pragma once
// Logarithmic decrement by a weighted line through the differences of successive extremes.

#include <optional>
#include <string>
#include <vector>

#include "identify/decay_model.hpp"

namespace ringwright::identify {

/// What the method reads from one stretch of samples. Extremes are the vertices of least-squares parabolas
/// over a quarter cycle: since each half cycle of a decay is a scaled copy of the one before, what the
/// parabola takes off is the same share of each and leaves the decrement alone.
struct DecrementReading {
    bool valid = false;
    std::string reason;
    double natural_frequency_hz = 0.0;
    double damping_ratio = 0.0;
    double decrement = 0.0;  ///< per cycle
    double bend = 0.0;       ///< second-order coefficient of ln D against half-cycle number; 0 below 4 points
    std::vector<double> half_cycle;      ///< number of each difference used
    std::vector<double> log_difference;  ///< ln of its size
    std::vector<double> line;            ///< the fitted line there
    std::vector<double> extreme_time;    ///< s
};

/// Reads the decrement. `frequency_hz` is the damped frequency to within about 15 %, `noise` the standard
/// deviation of the samples. Differences below four times their own standard deviation are not used: beyond
/// that the logarithm is biased.
[[nodiscard]] DecrementReading read_decrement(const DecaySamples& samples, double frequency_hz, double noise);

}  // namespace ringwright::identify
