#pragma once
// From a fitted damping law to what is reported of it.

#include <optional>
#include <vector>

#include "identify/law_fit.hpp"
#include "ringwright/estimate.hpp"
#include "ringwright/finding.hpp"
#include "ringwright/identify.hpp"
#include "ringwright/recording.hpp"

namespace ringwright::identify {

/// Half the distance between successive reversals, and when, s after the start of the fit. Amplitudes are of
/// the measured quantity, in units of the recording (of velocity and acceleration: displacement times the
/// natural angular frequency, or its square).
struct Swings {
    std::vector<double> time_s, amplitude;
};
[[nodiscard]] Swings swings_of(const LawFit& fit);

/// The last reversal, s after the start of the fit: with friction the mass may stand still from there on.
[[nodiscard]] double last_reversal_s(const LawFit& fit);

/// Amplitude half-way in time between the first swing and the last that stands above the noise, to two
/// digits.
[[nodiscard]] double middle_amplitude(const LawFit& fit);

/// Damping ratio of the viscous damper that takes the same energy in a cycle at this amplitude of the
/// measured quantity: c/(2√(km)) + 2F/(π m ω² X) + 4 c₂ X/(3π m), for two-way damping with c the mean of both
/// directions (Jacobsen 1930; Den Hartog). √(k/m) is that of small amplitudes.
[[nodiscard]] double equivalent_damping_ratio(const LawFit& fit, double amplitude);

/// natural_frequency is √(k/m)/2π at small amplitude; damping_ratio and what follows from it are the
/// equivalent viscous ones at `amplitude`.
[[nodiscard]] Quantities law_quantities(const LawFit& fit, double amplitude, double confidence_level);

/// Coefficients over the moving mass, in SI units: F/m in N/kg, c/m and c±/m in 1/s, c₂/m in 1/m, k₃/m in
/// 1/(m² s²), under the key of what they become once the mass is known. Only of recordings in SI units.
[[nodiscard]] Quantities law_per_mass(const LawFit& fit, double confidence_level);

/// The law in words, with the ratios that can be told without a mass.
[[nodiscard]] Findings describe_law(const LawFit& fit, const Recording& recording, double amplitude);

/// Envelope and rest position of the law in place of those of a viscous decay, and its damping ratio against
/// amplitude: the equivalent one, over the frequency that the spring has at that amplitude.
void draw_law(DecayPicture& picture, const LawFit& fit, double confidence_level);

}  // namespace ringwright::identify
