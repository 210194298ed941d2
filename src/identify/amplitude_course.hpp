#pragma once
// Damping ratio and frequency against amplitude, from the decay itself and without a law.

#include <limits>

#include "identify/curve_fit.hpp"
#include "ringwright/identify.hpp"

namespace ringwright::identify {

/// Which stretches are asked for. `shortest_periods` > 0: what a stretch has at least; 1.5 keeps the test of
/// amplitude dependence at its level. Nothing after `end_s` (s after the start of the fit) is used.
struct CourseLimits {
    double shortest_periods = 1.5;
    double end_s = std::numeric_limits<double>::infinity();
};

/// Splits the decay into three to eight successive stretches that tell about equally much of the damping, and
/// fits a viscous decay to each by generalised least squares, the noise model taken as known from `noise`.
/// Empty where fewer than three stretches tell the damping ratio to 30 %. Preconditions: both valid; `noise`
/// has the samples of `fit`, or of a longer window.
[[nodiscard]] AmplitudeCourse amplitude_course(const CurveFit& fit, const NoiseFit& noise,
                                               double confidence_level, const CourseLimits& limits = {});

/// The stretches, and the level of a viscous damping ratio beside them where no law has drawn its own.
void draw_course(DecayPicture& picture, const AmplitudeCourse& course, const MethodResult& fitted);

/// A finding where the course is not level although the model is viscous.
[[nodiscard]] Findings describe_course(const AmplitudeCourse& course);

}  // namespace ringwright::identify
