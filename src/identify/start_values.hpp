#pragma once
// Start values of the decay fit, found from the data.

#include <optional>

#include "identify/projected_fit.hpp"

namespace ringwright::identify {

/// A white-noise fit of one oscillator that is good enough to refine from: candidate frequencies from the
/// spectrum and, for decays that do not ring, from a grid of time constants; each tried over a grid of
/// damping ratios, the best few fitted. `near_hz` restricts the candidates to within ±40 % of a frequency.
/// The answer does not depend on the number of threads. Nothing where no start converges.
[[nodiscard]] std::optional<ProjectedFit> find_start(const DecaySamples& samples, double guess_hz,
                                                     std::optional<double> near_hz, unsigned threads = 1);

/// Where `fit` does not ring and the recording does, about `guess_hz`: the ring on a slow exponential, as an
/// AC-coupled sensor leaves them of a release. Nothing where that leaves more than a fifth of what
/// `fit` leaves.
[[nodiscard]] std::optional<ProjectedFit> find_ring_on_tail(const ProjectedFit& fit,
                                                            const DecaySamples& samples, double guess_hz);

}  // namespace ringwright::identify
