#pragma once
// Natural frequency and damping ratio of one free decay by three published methods, and whether they agree.

#include <cstdint>
#include <optional>
#include <string>
#include <vector>

#include "ringwright/estimate.hpp"
#include "ringwright/event.hpp"
#include "ringwright/finding.hpp"
#include "ringwright/recording.hpp"

namespace ringwright {

enum class MethodStatus { ok, not_applicable };

/// One mode of vibration that the curve fit found. `amplitude` is the modulus of the decaying term at the
/// start of the fit in units of the samples (SI where the recording is scaled).
struct Mode {
    Quantities quantities;
    double amplitude = 0.0;
};

/// What one method says. `not_applicable` carries the reason in a sentence, and no quantities.
struct MethodResult {
    MethodStatus status = MethodStatus::not_applicable;
    std::string reason;
    /// Curve fit only: "viscous", "viscous+friction", "two-way", "viscous+quadratic", "viscous+hardening",
    /// "viscous+softening" and combinations ("two-way+friction").
    std::string model;
    Quantities quantities;
    /// Where the model is not "viscous": amplitude of the measured quantity, in units of the samples, at
    /// which the damping ratio and what follows from it are the equivalent viscous ones.
    std::optional<double> at_amplitude;
    /// Where the model is not "viscous" and the samples are in SI units: its coefficients over the moving
    /// mass (or inertia), each under the key of what it becomes once that is known: friction_force in N/kg,
    /// damping_coefficient, compression_damping and rebound_damping in 1/s, quadratic_damping in 1/m,
    /// cubic_stiffness in 1/(m² s²). Compression is where the recorded displacement rises.
    Quantities per_mass;
    std::vector<Mode> modes;  ///< curve fit only, strongest (or the one meant) first
};

/// Whether the three methods agree, as a test that knows how their errors go together.
struct Agreement {
    bool tested = false;
    bool consistent = true;
    double p_value = 1.0;
    std::string reading;  ///< a sentence: what agreement or disagreement suggests
};

/// What the pictures of one event need. Times in s on the recording's clock, values in units of the samples.
struct DecayPicture {
    std::vector<double> time_s, observed, fitted, envelope, residual;
    double offset =
        0.0;  ///< level about which the decay swings; the lower envelope is its mirror image there
    std::vector<double> half_cycle, log_amplitude,
        log_amplitude_line;                      ///< points used by the logarithmic decrement
    std::vector<double> frequency_hz, spectrum;  ///< magnitude around the mode
    double half_power_low_hz = 0.0, half_power_high_hz = 0.0, half_power_level = 0.0;
    std::vector<double> residual_autocorrelation;  ///< lags 0, 1, …
    double residual_autocorrelation_band = 0.0;    ///< half-width of the 95 % band of white noise
    std::vector<double> course_amplitude, course_damping_ratio, course_low,
        course_high;  ///< damping against amplitude, of stretches
    /// Damping against amplitude after the fitted model, with the interval at the confidence level: a level
    /// where the decay is viscous.
    std::vector<double> model_amplitude, model_damping_ratio, model_low, model_high;
};

/// Damping and frequency of one stretch of the decay. The amplitude is that in its middle, in units of the
/// samples.
struct AmplitudePoint {
    double amplitude = 0.0;
    Estimate damping_ratio, natural_frequency;
};

/// Chance that a decay whose damping and frequency do not change is said to depend on amplitude.
inline constexpr double amplitude_dependence_level = 0.01;

/// Damping ratio and frequency against amplitude, from successive stretches of the decay, each as a viscous
/// decay of its own: no law assumed. Empty where the decay is too short or too noisy for three of them.
struct AmplitudeCourse {
    std::vector<AmplitudePoint> points;  ///< in the order of time
    bool tested = false;
    double p_value = 1.0;  ///< of damping and frequency being the same in all of them
    bool depends_on_amplitude = false;
};

/// Gravity at the bench, m/s². Where it is not told: standard gravity, with the standard uncertainty of a
/// rectangular distribution from the equator (9.780) to the poles (9.832; both from memory).
struct Gravity {
    double value = 9.80665;
    double standard_uncertainty = 0.015;
};

struct IdentifyOptions {
    double confidence_level = 0.95;
    std::optional<double> near_hz;
    std::optional<int> modes;
    /// Amplitude at which an equivalent damping ratio is stated, SI; of `amplitude_of`, else of what was
    /// measured. Absent: the middle of the decay.
    std::optional<double> at_amplitude;
    std::optional<MeasuredQuantity> amplitude_of;
    Gravity gravity;             ///< for what a drop says
    bool pictures = false;       ///< fill DecayPicture
    std::uint64_t seed = 20311;  ///< of the bootstrap; the same recording and seed give the same answer
    int replicates = 200;        ///< of the bootstrap; 0: curve fit only
    unsigned threads = 1;        ///< within a release; the answer does not depend on it
};

struct EventIdentification {
    Event event;
    double start_s = 0.0, end_s = 0.0;
    MethodResult logarithmic_decrement, half_power_bandwidth, curve_fit;
    Agreement agreement;
    AmplitudeCourse course;
    Findings findings;
    DecayPicture picture;
};

/// Runs the three methods on one event. Never throws for what is in the samples.
[[nodiscard]] EventIdentification identify_event(const Recording& recording, const Event& event,
                                                 const IdentifyOptions& options = {});

}  // namespace ringwright
