#pragma once
// Whether the three methods agree, and what a disagreement suggests.

#include "identify/method_bootstrap.hpp"
#include "ringwright/identify.hpp"

namespace ringwright::identify {

/// Probability below which the methods are said to disagree: one clean recording in a hundred.
constexpr double disagreement_level = 0.01;

/// Hotelling's T² of the differences between each simple method (bias removed) and the curve fit, with their
/// common covariance from the replicates.
[[nodiscard]] Agreement test_agreement(const CurveFit& fit, const MethodBootstrap& bootstrap,
                                       const Findings& findings);

}  // namespace ringwright::identify
