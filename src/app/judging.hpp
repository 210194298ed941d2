#pragma once
// From the budget of a result to what a verdict and a comparison need of it.

#include <map>

#include "ringwright/analysis.hpp"
#include "ringwright/comparison.hpp"
#include "ringwright/conformity.hpp"

namespace ringwright::app {

/// What part of each uncertainty further releases would reduce.
[[nodiscard]] std::map<Quantity, UncertaintyParts> uncertainty_parts(const PooledResult& result);

/// What the two results owe to one and the same mass, clock and sensor.
[[nodiscard]] CommonContributions common_contributions(const PooledResult& before, const PooledResult& after);

}  // namespace ringwright::app
