#pragma once
// The stretch of a recording over which a damping law holds.

#include "identify/law_fit.hpp"
#include "ringwright/event.hpp"
#include "ringwright/recording.hpp"

namespace ringwright::identify {

/// A search for free decays that knows only viscous ones may start late or end early in one that is not, and
/// the viscous fit may have left out the first swings. Takes earlier samples, a quarter of a period at a time
/// and then less, while the law fitted with them leaves no more than noise there (chi-squared, one false
/// alarm in ten thousand), and the rest behind the decay where it has the same noise (F, one in a thousand).
/// Of a displacement that was held still before, samples before the release and those in which noise hides it
/// are taken off: the release is where the fitted swing turns. Leaves windows given by hand as they are, and
/// widens no fit with a drift, further modes or real poles.
void widen(LawFit& fit, const Recording& recording, const Event& event);

/// Root mean square of the residual, in units of the recording.
[[nodiscard]] double residual_level(const CurveFit& fit);

/// The event with its start moved back over a stretch of at least a quarter of a period in which the
/// recording already moves (scatters beyond three times the noise within a period): a search that
/// expects a viscous decay may miss the first swings of one that is not. Nothing where it rests or is held
/// still before the event.
[[nodiscard]] std::optional<Event> with_earlier_start(const CurveFit& fit, const Recording& recording,
                                                      const Event& event);

}  // namespace ringwright::identify
