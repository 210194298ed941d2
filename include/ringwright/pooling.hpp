#pragma once
// Repeats on one article: one value and interval from several releases.

#include <vector>

#include "ringwright/estimate.hpp"

namespace ringwright {

/// Pooled estimate of repeats and how much they scatter beyond their own uncertainties.
struct Pooled {
    Estimate estimate;
    double between_standard_deviation =
        0.0;  ///< of the true values of the releases (Mandel & Paule 1982), 0 when none is seen
    double heterogeneity_p_value = 1.0;  ///< of Cochran's Q
};

/// Between-release variance after Mandel & Paule (1982), interval after Hartung & Knapp (2001) with n − 1
/// degrees of freedom. One release: its own estimate. Precondition: not empty, every standard uncertainty >
/// 0.
[[nodiscard]] Pooled pool_repeats(const std::vector<Estimate>& releases, double confidence_level);

}  // namespace ringwright
