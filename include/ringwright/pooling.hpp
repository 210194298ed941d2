#pragma once
// Repeats on one article: one value and interval from several releases.

#include <vector>

#include "ringwright/estimate.hpp"

namespace ringwright {

/// Pooled estimate of repeats and how much they scatter beyond their own uncertainties. Standard deviations
/// are in the unit of the quantity, also where the pooling was done on logarithms.
struct Pooled {
    Estimate estimate;
    double between_standard_deviation =
        0.0;  ///< of the true values of the releases (Mandel & Paule 1982), 0 when none is seen
    double heterogeneity_p_value =
        1.0;  ///< of Cochran's Q; small when the releases differ beyond their uncertainties
    double within_standard_uncertainty =
        0.0;  ///< what the releases' own uncertainties alone leave in the mean
};

/// The scale on which releases are averaged. `logarithmic` is for quantities that are positive by nature:
/// relative scatter is then treated alike whatever its sign, the weights do not favour releases that happen
/// to come out small, and the pooled quality factor is exactly one over twice the pooled damping ratio. It
/// falls back to `linear` where a value is not positive or a standard uncertainty exceeds half the value.
enum class PoolingScale { linear, logarithmic };

/// Between-release variance after Mandel & Paule (1982), interval after Hartung & Knapp (2001) with n − 1
/// degrees of freedom: value ± t(n−1)·u on the scale of pooling, u² = Σ w(x−x̄)²/((n−1) Σ w). One release: its
/// own estimate.
///
/// Three points are not in those papers and are there because coverage was measured without them and fell
/// short (docs/decisions/pooling.md): the releases' own variances, where they have few degrees of freedom,
/// are first drawn towards their common value as far as their scatter is explained by those degrees of
/// freedom (Smyth 2004, moderated variances); weights use standard uncertainties no more uneven than 3 : 1;
/// and u is not let fall below what a Q at its 5 % point would give, so that two releases that agree by
/// chance do not claim an uncertainty near zero. Coverage at 95 %, n = 2 … 10, between-release scatter 0 … 5
/// times within, own degrees of freedom ≥ 3, own uncertainties within 4 : 1: 93–97 %; within 9 : 1 92.8–97.2
/// %. Precondition: not empty, every value finite, every standard uncertainty > 0.
[[nodiscard]] Pooled pool_repeats(const std::vector<Estimate>& releases, double confidence_level,
                                  PoolingScale scale = PoolingScale::linear);

}  // namespace ringwright
