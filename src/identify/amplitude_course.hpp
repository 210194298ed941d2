#pragma once
// Damping ratio and frequency against amplitude, from the decay itself and without a law.

#include "identify/curve_fit.hpp"
#include "ringwright/identify.hpp"

namespace ringwright::identify {

/// Splits the decay into three to eight successive stretches of at least one and a half periods that tell
/// about equally much of the damping, and fits a viscous decay to each by generalised least squares, the
/// noise model taken as known from `noise`. Empty where fewer than three stretches tell the damping ratio to
/// 30 %. Preconditions: both valid; `noise` has the samples of `fit`, or of a longer window.
[[nodiscard]] AmplitudeCourse amplitude_course(const CurveFit& fit, const NoiseFit& noise,
                                               double confidence_level);

void draw_course(DecayPicture& picture, const AmplitudeCourse& course);

/// A finding where the course is not level although the model is viscous.
[[nodiscard]] Findings describe_course(const AmplitudeCourse& course);

}  // namespace ringwright::identify
