#pragma once
// The article as a model of its inputs: frequencies, damping ratios, masses, clock; for the law of
// propagation.

#include <cstddef>
#include <optional>
#include <span>
#include <vector>

#include "ringwright/propagation.hpp"
#include "ringwright/property.hpp"

namespace ringwright::property {

/// The inputs of all loadings in one list, and where each stands in it.
struct ArticleModel {
    std::vector<ModelInput> inputs;
    std::vector<InputCorrelation> correlations;
    std::vector<std::size_t> frequency_inputs, damping_inputs, added_mass_inputs;  ///< one a loading
    std::optional<std::size_t> mass_input, spring_mass_input;
    std::size_t clock_input = 0;  ///< relative error of the recorder's clock; its value is 0
    std::vector<Loading> loadings;
    std::vector<double> stiffness_weights, damping_weights, line_weights;  ///< sum to one; held fixed
};

[[nodiscard]] ArticleModel article_model(const std::vector<Loading>& loadings, const Article& article,
                                         const CommonInfluences& influences);
[[nodiscard]] std::vector<double> values_of(const ArticleModel& model);

/// Known mass: stiffness and damping coefficient as the weighted mean over the loadings.
[[nodiscard]] ModelFunction mean_stiffness(const ArticleModel& model);
[[nodiscard]] ModelFunction mean_damping(const ArticleModel& model);

/// Known mass: a damping law's coefficient over the moving mass times that mass, the mean over the loadings
/// that have one, weighted by their uncertainties. Appends the inputs that it needs. Empty where none has
/// one.
[[nodiscard]] ModelFunction law_coefficient(ArticleModel& model, Quantity quantity);

/// 1/ω² = intercept + slope · added mass, s² and s²/kg.
struct Line {
    double slope = 0.0;
    double intercept = 0.0;
};
[[nodiscard]] Line fitted_line(const ArticleModel& model, std::span<const double> at);
[[nodiscard]] ModelFunction line_stiffness(const ArticleModel& model);
[[nodiscard]] ModelFunction line_mass(const ArticleModel& model);
[[nodiscard]] ModelFunction line_damping(const ArticleModel& model);

/// How well three or more loadings lie on one line.
struct LineFit {
    double birge_ratio = 1.0;  ///< √(χ²/ν), not below 1
    double degrees_of_freedom = 0.0;
    double p_value = 1.0;
};
[[nodiscard]] LineFit line_fit_quality(const ArticleModel& model);

/// One line for each input that matters; a frequency or damping ratio with a share of repeatability gives
/// two.
[[nodiscard]] std::vector<BudgetLine> budget_lines(const ArticleModel& model, const Propagated& propagated,
                                                   Quantity quantity);

}  // namespace ringwright::property
