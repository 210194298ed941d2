#pragma once
// What the fall of a drop says beside the decay: height, speed at first touch, static deflection.

#include "identify/curve_fit.hpp"
#include "ringwright/identify.hpp"

namespace ringwright::identify {

/// The decay that follows the fall, with the level about which it swings (units of the samples).
struct RestingDecay {
    Estimate natural_frequency, damping_ratio;
    double level = 0.0, level_standard_uncertainty = 0.0;
    /// Power spectral density of the noise at low frequency, two-sided, units of the samples squared times s:
    /// a mean over T seconds has the variance noise_density/T.
    double noise_density = 0.0;
};
[[nodiscard]] RestingDecay resting_decay(const CurveFit& fit, const Quantities& quantities);

struct DropReading {
    Quantities quantities;  ///< drop_height, contact_velocity, static_deflection where they can be told
    Findings findings;
};

/// Reads the first fall of `event` in a recording in SI units.
///
/// Displacement: hold, parabola from rest, and from first touch on the free motion of the mass on its spring,
/// which begins to push there; hold, curvature and the moments of
/// release and touch by least squares. Height: from hold to touch. Contact velocity: of the parabola at the
/// touch. Static deflection δ: from touch to the rest position. It is found from the place of the touch, not
/// from the frequency, so that g/δ = k/m checks ω_n²: finding "static_deflection_disagrees" where they differ
/// by 1 % and by what their uncertainties allow once in a thousand. Finding "fall_disagrees_with_gravity"
/// where the curvature differs from gravity by as much: the sensor's scale, or what held the mass back.
///
/// Acceleration: time T from the release, where the hold turns into free fall (a step, or a ramp of up to 60
/// ms), to the touch, where free fall turns into the push of spring and damper on a mass that comes in at gT;
/// both by least squares; height gT²/2, contact velocity gT. Static deflection g/ω_n², from the frequency.
/// The same finding where the rest position does not lie gravity away from free fall, by 1 % and by what
/// noise does once in a thousand. The noise of the means is that of the decay at low frequency, or that of
/// the stretch itself, whichever is more.
///
/// The uncertainties leave out those of gravity, the clock and the sensor's gain, which repeats share: they
/// are added where repeats are pooled.
///
/// Assumed: the mass falls from rest; the spring is straight from touch to rest; nothing else touches.
/// Nothing is told where the release is not in the recording, and nothing of a velocity.
[[nodiscard]] DropReading read_drop(const Recording& recording, const Event& event, const RestingDecay& decay,
                                    const Gravity& gravity, double confidence_level);

}  // namespace ringwright::identify
