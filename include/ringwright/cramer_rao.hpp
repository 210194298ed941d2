#pragma once
// The least scatter that any unbiased method can have on a decaying sinusoid in white noise.

#include <cstddef>

namespace ringwright {

/// y(t) = A e^(−at) cos(ω_d t + φ), a = ζω_n, ω_d = ω_n√(1 − ζ²).
struct DecayingSinusoid {
    double amplitude = 1.0;             ///< A, unit of the samples
    double natural_frequency_hz = 1.0;  ///< undamped
    double damping_ratio = 0.0;         ///< 0 ≤ ζ < 1
    double phase_rad = 0.0;             ///< φ at the first sample
};

/// Samples at 0, 1/rate, 2/rate … with independent noise of this standard deviation.
struct SamplingPlan {
    double sample_rate_hz = 1.0;
    std::size_t sample_count = 0;
    double noise_standard_deviation = 0.0;
    bool offset_known = true;  ///< false: a constant offset is estimated as well
};

/// Lower bounds of standard deviations.
struct DecayBound {
    double amplitude = 0.0;
    double decay_rate = 0.0;                ///< of a, 1/s
    double damped_angular_frequency = 0.0;  ///< of ω_d, rad/s
    double phase_rad = 0.0;
    double natural_frequency_hz = 0.0;
    double damping_ratio = 0.0;
};

/// Cramér–Rao bound s²(JᵀJ)⁻¹ with J the derivatives of the samples by A, a, ω_d, φ (Yao & Pandit 1995, IEEE
/// Trans. Signal Process. 43, 878; Kay 1993, chapter 3; both from memory), carried over to f_n and ζ to first
/// order. For records much longer than 1/a and many cycles: sd(a) = sd(ω_d) = 4 (s/A) √(a³/rate).
/// Precondition: amplitude, rate and frequency > 0, 0 ≤ ζ < 1, more samples than parameters, which they
/// determine.
[[nodiscard]] DecayBound cramer_rao_bound(const DecayingSinusoid& decay, const SamplingPlan& plan);

}  // namespace ringwright
