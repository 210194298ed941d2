#pragma once
// Half-power bandwidth of a decay, by the exact relation at finite damping.

#include <string>

#include "identify/decay_model.hpp"

namespace ringwright::identify {

/// How the spectrum is taken: chosen once from the data and kept for all replicates of the bootstrap.
struct HalfPowerSettings {
    double cycle_hz = 0.0;      ///< damped frequency: the offset is a mean over whole cycles of it
    double frequency_hz = 0.0;  ///< where the peak is, to within about 20 %
    double end_s = 0.0;         ///< the record is cut here
    double window_rate =
        0.0;  ///< of the exponential window, 1/s; its decay rate is taken out of the answer exactly
    double width_hz = 0.0;  ///< full half-power width expected (start of the search)
    bool peak_known =
        false;  ///< frequency and width are those read from the data: replicates look there only
};

/// What the method reads. The record is cut so that it begins at a zero crossing of the offset-free signal:
/// then it is e^(−s t) sin √p t whatever was measured, and its spectrum has the shape of a receptance, whose
/// half-power points lie at ω² = ω_n²[1 − 2ζ² ± 2ζ√(1 − ζ²)]. With ζ = sin θ: tan 2θ = (ω₂² − ω₁²)/(ω₁² +
/// ω₂²), ω_n² = (ω₁² + ω₂²)/(2 cos 2θ).
struct HalfPowerReading {
    bool valid = false;
    std::string reason;
    double natural_frequency_hz = 0.0;
    double damping_ratio = 0.0;
    double low_hz = 0.0, high_hz = 0.0, peak_hz = 0.0;  ///< of the spectrum as windowed
    double peak_power = 0.0;
};

[[nodiscard]] HalfPowerReading read_half_power(const DecaySamples& samples,
                                               const HalfPowerSettings& settings);

/// Rate of the exponential window that brings what is left at `end_s` down to one per cent where a decay of
/// `decay_rate` alone does not.
[[nodiscard]] double window_rate_for(double frequency_hz, double decay_rate, double end_s);

/// Settings for these samples; `decay_rate` is a first idea of ζω_n.
[[nodiscard]] HalfPowerSettings choose_half_power_settings(const DecaySamples& samples, double frequency_hz,
                                                           double decay_rate, double end_s);

/// |X(f)|² of the windowed record, for the picture.
[[nodiscard]] Eigen::VectorXd half_power_spectrum(const DecaySamples& samples,
                                                  const HalfPowerSettings& settings,
                                                  const Eigen::VectorXd& frequency_hz);

}  // namespace ringwright::identify
