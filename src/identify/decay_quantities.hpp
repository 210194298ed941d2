#pragma once
// From a fitted decay to frequency, damping ratio and what follows from them, with intervals.

#include <Eigen/Core>

#include "identify/curve_fit.hpp"
#include "ringwright/estimate.hpp"

namespace ringwright::identify {

/// The largest damping ratio that an interval is followed to; where the recording sets no upper end, it ends
/// here.
constexpr double largest_damping_ratio = 100.0;

/// All quantities of oscillator `index`. Where the problem is curved over the width of its own interval (few
/// cycles, heavy damping, much noise), the intervals are those of the profile likelihood and may be lopsided.
/// A quantity that does not exist, or whose interval has no finite end, is left out.
[[nodiscard]] Quantities decay_quantities(const CurveFit& fit, std::size_t index, double confidence_level);

/// Standard uncertainty of the size of the decay of oscillator `index` over that size, from its energy beside
/// the noise at the same frequencies, of the plateau before a release too: its size and nothing else unknown.
[[nodiscard]] double relative_uncertainty_of_size(const CurveFit& fit, std::size_t index);

/// Quantities that follow from one damping ratio and one undamped frequency (both with intervals) and their
/// correlation.
[[nodiscard]] Quantities quantities_from(const Estimate& natural_frequency, const Estimate& damping_ratio,
                                         double correlation, double confidence_level);

/// Adds logarithmic decrement, loss factor and quality factor, where they exist, to a damping ratio.
void add_functions_of_damping(Quantities& quantities);

}  // namespace ringwright::identify
