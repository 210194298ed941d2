#include "ringwright/propagation.hpp"

#include <algorithm>
#include <cassert>
#include <cmath>

#include "ringwright/distributions.hpp"

namespace ringwright {
namespace {

constexpr double infinity = std::numeric_limits<double>::infinity();

double central_difference(const ModelFunction& model, std::vector<double>& at, std::size_t input,
                          double step) {
    const double centre = at[input];
    at[input] = centre + step;
    const double above = model(at);
    const double stretch_above = at[input] - centre;
    at[input] = centre - step;
    const double below = model(at);
    const double stretch_below = centre - at[input];
    at[input] = centre;
    return (above - below) / (stretch_above + stretch_below);
}

/// Step of the differences: a standard uncertainty, but no more than 1e-3 of the value, where the
/// extrapolation is good to 1e-12 and rounding costs 1e-13/1e-3.
double step_of(const ModelInput& input) {
    const double size = std::abs(input.value);
    if (input.standard_uncertainty > 0.0)
        return size > 0.0 ? std::min(input.standard_uncertainty, 1e-3 * size) : input.standard_uncertainty;
    return size > 0.0 ? 1e-3 * size : 1e-3;
}

/// Richardson's extrapolation of two central differences: error of fourth order in the step.
std::vector<double> numeric_gradient(const std::vector<ModelInput>& inputs, const ModelFunction& model,
                                     std::vector<double> at) {
    std::vector<double> gradient(inputs.size());
    for (std::size_t i = 0; i < inputs.size(); ++i) {
        // An input as uncertain as it is small still needs a step that the rounding of f does not drown.
        const double step = std::max(step_of(inputs[i]), 1e-7 * std::abs(inputs[i].value));
        const double coarse = central_difference(model, at, i, step);
        const double fine = central_difference(model, at, i, step / 2.0);
        gradient[i] = (4.0 * fine - coarse) / 3.0;
    }
    return gradient;
}

/// Σ_j r_ij c_j u_j for each i, the uncorrelated own term included.
std::vector<double> correlated_sums(const std::vector<double>& signed_contributions,
                                    const std::vector<InputCorrelation>& correlations) {
    std::vector<double> sums = signed_contributions;
    for (const InputCorrelation& pair : correlations) {
        assert(pair.first != pair.second);
        sums[pair.first] += pair.coefficient * signed_contributions[pair.second];
        sums[pair.second] += pair.coefficient * signed_contributions[pair.first];
    }
    return sums;
}

std::vector<double> signed_contributions(const std::vector<ModelInput>& inputs, const Propagated& result) {
    std::vector<double> products(inputs.size());
    for (std::size_t i = 0; i < inputs.size(); ++i)
        products[i] = result.contributions[i].sensitivity * inputs[i].standard_uncertainty;
    return products;
}

double welch_satterthwaite(const std::vector<ModelInput>& inputs, const std::vector<double>& contributions,
                           double standard_uncertainty) {
    double sum = 0.0;
    for (std::size_t i = 0; i < inputs.size(); ++i) {
        if (!std::isfinite(inputs[i].degrees_of_freedom)) continue;
        sum += std::pow(contributions[i] / standard_uncertainty, 4) / inputs[i].degrees_of_freedom;
    }
    return sum > 0.0 ? 1.0 / sum : infinity;
}

double combined_variance(const std::vector<double>& products,
                         const std::vector<InputCorrelation>& correlations) {
    const std::vector<double> sums = correlated_sums(products, correlations);
    double variance = 0.0;
    for (std::size_t i = 0; i < products.size(); ++i) variance += products[i] * sums[i];
    return variance;
}

/// How much wider than t·u the input's interval is on one side; on the logarithm where both allow it.
double side_ratio(const ModelInput& input, bool upper, double confidence_level, bool positive) {
    if (!input.interval || !(input.standard_uncertainty > 0.0)) return 1.0;
    const double symmetric =
        student_t_factor(confidence_level, input.degrees_of_freedom) * input.standard_uncertainty;
    const double end = upper ? input.interval->high : input.interval->low;
    if (positive && input.value > 0.0 && end > 0.0)
        return std::abs(std::log(end / input.value)) * input.value / symmetric;
    return std::abs(end - input.value) / symmetric;
}

/// Half-width of the result on one side, in the unit of the result.
double half_width(const Propagated& result, const std::vector<ModelInput>& inputs,
                  const std::vector<InputCorrelation>& correlations, double confidence_level, bool positive,
                  bool upper) {
    std::vector<double> products = signed_contributions(inputs, result);
    for (std::size_t i = 0; i < inputs.size(); ++i) {
        if (products[i] == 0.0) continue;
        const bool upper_end_drives = upper == (products[i] > 0.0);
        products[i] *= side_ratio(inputs[i], upper_end_drives, confidence_level, positive);
    }
    const double variance = combined_variance(products, correlations);
    if (std::isnan(variance) || std::isinf(variance)) return infinity;
    if (!(variance > 0.0)) return 0.0;
    const double uncertainty = std::sqrt(variance);
    return student_t_factor(confidence_level, welch_satterthwaite(inputs, products, uncertainty)) *
           uncertainty;
}

}  // namespace

Propagated propagate(const std::vector<ModelInput>& inputs, const ModelFunction& model,
                     const std::vector<InputCorrelation>& correlations, const ModelGradient& gradient) {
    std::vector<double> at;
    for (const ModelInput& input : inputs) at.push_back(input.value);
    const std::vector<double> sensitivities = gradient ? gradient(at) : numeric_gradient(inputs, model, at);

    Propagated result;
    result.value = model(at);
    for (std::size_t i = 0; i < inputs.size(); ++i)
        result.contributions.push_back(
            {sensitivities[i], std::abs(sensitivities[i]) * inputs[i].standard_uncertainty, 0.0});

    const std::vector<double> products = signed_contributions(inputs, result);
    const std::vector<double> sums = correlated_sums(products, correlations);
    const double variance = combined_variance(products, correlations);
    if (!(variance > 0.0)) return result;
    result.standard_uncertainty = std::sqrt(variance);
    for (std::size_t i = 0; i < inputs.size(); ++i)
        result.contributions[i].share = products[i] * sums[i] / variance;
    result.degrees_of_freedom = welch_satterthwaite(inputs, products, result.standard_uncertainty);
    return result;
}

double propagated_covariance(const std::vector<ModelInput>& inputs,
                             const std::vector<InputCorrelation>& correlations, const Propagated& first,
                             const Propagated& second) {
    const std::vector<double> sums = correlated_sums(signed_contributions(inputs, second), correlations);
    const std::vector<double> products = signed_contributions(inputs, first);
    double covariance = 0.0;
    for (std::size_t i = 0; i < inputs.size(); ++i) covariance += products[i] * sums[i];
    return covariance;
}

Estimate estimate_of(const Propagated& result, const std::vector<ModelInput>& inputs,
                     const std::vector<InputCorrelation>& correlations, double confidence_level,
                     bool positive) {
    const bool logarithmic = positive && result.value > 0.0;
    const double above = half_width(result, inputs, correlations, confidence_level, logarithmic, true);
    const double below = half_width(result, inputs, correlations, confidence_level, logarithmic, false);
    Estimate estimate{result.value, result.standard_uncertainty, {}, result.degrees_of_freedom};
    if (logarithmic)
        estimate.interval = {result.value * std::exp(-below / result.value),
                             result.value * std::exp(above / result.value)};
    else
        estimate.interval = {result.value - below, result.value + above};
    return estimate;
}

}  // namespace ringwright
