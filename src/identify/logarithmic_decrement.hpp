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

/// Where the extremes are looked for: chosen once from the data and kept for all replicates of the bootstrap,
/// so that the noise has no say in which are used.
struct DecrementSettings {
    double first_time_s = 0.0;   ///< of the first extreme
    double half_period_s = 0.0;  ///< between extremes
    int extremes = 0;            ///< how many stand well above the noise
};

/// First extreme whose parabola fits into the samples, and as many as keep the difference of neighbours above
/// five times its own standard deviation: beyond that the logarithm is biased. The oscillation
/// and its amplitudes are those of a fit, `noise` the standard deviation of the samples.
[[nodiscard]] DecrementSettings choose_decrement_settings(const DecaySamples& samples,
                                                          const Oscillator& oscillator,
                                                          double cosine_amplitude, double sine_amplitude,
                                                          double noise);

[[nodiscard]] DecrementReading read_decrement(const DecaySamples& samples, const DecrementSettings& settings);

}  // namespace ringwright::identify
