#pragma once
// What the residuals of a fit say about it, in plain words.

#include "identify/curve_fit.hpp"
#include "ringwright/finding.hpp"

namespace ringwright::identify {

/// False-alarm rate of each check on a clean recording.
constexpr double residual_check_level = 0.01;

/// Whiteness (Ljung & Box 1978), normality (Jarque & Bera 1987) and trend with amplitude of the innovations.
[[nodiscard]] Findings check_residuals(const CurveFit& fit);

}  // namespace ringwright::identify
