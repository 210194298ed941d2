#pragma once
// Intervals of variances that are combinations of mean squares.

#include <vector>

#include "ringwright/quality_statistics.hpp"

namespace ringwright {

/// A mean square with its degrees of freedom and the weight it has in the combination.
struct WeightedSquare {
    double weight = 0.0, mean_square = 0.0, degrees_of_freedom = 0.0;
};

/// Σ weight·MS. A single square: chi-squared; all weights positive: Graybill & Wang (1980); a difference of
/// two (the negative one last): Ting et al. (1990); more with a negative one among them: the same without the
/// cross terms, which are small. Ends below zero are zero.
[[nodiscard]] VarianceComponent component_of(const std::vector<WeightedSquare>& squares,
                                             double confidence_level);

}  // namespace ringwright
