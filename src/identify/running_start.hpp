#pragma once
// A heavily damped decay that was running when the recording began.

#include <optional>

#include "identify/curve_fit.hpp"
#include "ringwright/event.hpp"
#include "ringwright/recording.hpp"

namespace ringwright::identify {

/// A search for the start that takes noise for white starts late in slow noise, and beyond critical damping
/// the first hundredths of a period tell the damping ratio. Where the recording begins less than a quarter of
/// a period (or half a time constant of the slow pole) before the fit, and decay and noise as fitted explain
/// the samples in between (chi-squared, one false alarm in twenty), the event with the recording's first
/// sample as its start, and the fit of that. Nothing for lightly damped decays (0.1) and white noise, where
/// the search is right.
struct RunningStart {
    Event event;
    CurveFit fit;
};
[[nodiscard]] std::optional<RunningStart> fit_from_first_sample(const CurveFit& fit,
                                                                const Recording& recording,
                                                                const Event& event,
                                                                const CurveFitOptions& options);

}  // namespace ringwright::identify
