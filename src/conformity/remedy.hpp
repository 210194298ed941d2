#pragma once
// What would settle a value that is too uncertain to decide.

#include "ringwright/conformity.hpp"

namespace ringwright {

/// Guard band divided by standard uncertainty: guard multiple times coverage factor.
[[nodiscard]] double guard_factor(const DecisionOptions& options, double degrees_of_freedom);

/// For a value that guarded acceptance leaves undecided.
[[nodiscard]] Remedy find_remedy(const Limit& limit, const Estimate& estimate, const DecisionOptions& options,
                                 const std::optional<UncertaintyParts>& parts);

}  // namespace ringwright
