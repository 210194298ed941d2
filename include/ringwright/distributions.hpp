#pragma once
// Quantiles and probabilities of the few distributions the tool needs (Boost.Math inside).

namespace ringwright {

/// Two-sided Student t factor: P(|T| ≤ t) = confidence_level; degrees of freedom may be infinite or not
/// whole; > 0.
[[nodiscard]] double student_t_factor(double confidence_level, double degrees_of_freedom);
/// P(T ≤ t) of Student's t.
[[nodiscard]] double student_t_probability(double t, double degrees_of_freedom);
[[nodiscard]] double normal_probability(double z);
[[nodiscard]] double normal_quantile(double probability);
/// x of this and of f_probability may be infinite, as a ratio to a variance of zero is.
[[nodiscard]] double chi_squared_probability(double x, double degrees_of_freedom);
[[nodiscard]] double chi_squared_quantile(double probability, double degrees_of_freedom);
[[nodiscard]] double f_probability(double x, double numerator_df, double denominator_df);
[[nodiscard]] double f_quantile(double probability, double numerator_df, double denominator_df);

}  // namespace ringwright
