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
    std::string model;  ///< curve fit only: "viscous", …
    Quantities quantities;
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
        course_high;  ///< damping against amplitude
};

struct IdentifyOptions {
    double confidence_level = 0.95;
    std::optional<double> near_hz;
    std::optional<int> modes;
    std::optional<double> at_amplitude;  ///< SI; amplitude at which an equivalent damping ratio is stated
    bool pictures = false;               ///< fill DecayPicture
    std::uint64_t seed = 20311;  ///< of the bootstrap; the same recording and seed give the same answer
    int replicates = 200;        ///< of the bootstrap; 0: curve fit only
};

struct EventIdentification {
    Event event;
    double start_s = 0.0, end_s = 0.0;
    MethodResult logarithmic_decrement, half_power_bandwidth, curve_fit;
    Agreement agreement;
    Findings findings;
    DecayPicture picture;
};

/// Runs the three methods on one event. Never throws for what is in the samples.
[[nodiscard]] EventIdentification identify_event(const Recording& recording, const Event& event,
                                                 const IdentifyOptions& options = {});

}  // namespace ringwright
