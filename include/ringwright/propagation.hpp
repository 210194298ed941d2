#pragma once
// The law of propagation of uncertainty for any model of several inputs (JCGM 100:2008, clause 5 and annex
// G.4).

#include <cstddef>
#include <functional>
#include <limits>
#include <optional>
#include <span>
#include <string>
#include <vector>

#include "ringwright/estimate.hpp"

namespace ringwright {

/// One input of a model: value, standard uncertainty ≥ 0, degrees of freedom > 0 (infinite where nothing
/// limits them), all in SI units. `unit` and `name` are carried through to the budget. `interval`, where the
/// input has one of its own that may be lopsided, belongs to the confidence level that is asked for in
/// `estimate_of`.
struct ModelInput {
    std::string name;
    double value = 0.0;
    double standard_uncertainty = 0.0;
    double degrees_of_freedom = std::numeric_limits<double>::infinity();
    std::string unit;
    std::optional<Interval> interval;
};

/// Correlation coefficient of two inputs, −1 … 1.
struct InputCorrelation {
    std::size_t first = 0;
    std::size_t second = 0;
    double coefficient = 0.0;
};

using ModelFunction = std::function<double(std::span<const double>)>;
/// Fills one partial derivative for each input.
using ModelGradient = std::function<std::vector<double>(std::span<const double>)>;

/// What one input adds: sensitivity ∂f/∂x_i, contribution |∂f/∂x_i| u(x_i), and share of the combined
/// variance. The cross terms of correlated inputs are divided evenly between the two, so that the shares add
/// up to one; a share can be negative where a correlation lowers the combined variance.
struct Contribution {
    double sensitivity = 0.0;
    double contribution = 0.0;
    double share = 0.0;
};

/// y = f(x_1 … x_n) with u²(y) = Σ_i Σ_j c_i c_j u(x_i, x_j) (JCGM 100, equations 10 and 13).
struct Propagated {
    double value = 0.0;
    double standard_uncertainty = 0.0;
    double degrees_of_freedom = std::numeric_limits<double>::infinity();
    std::vector<Contribution> contributions;  ///< in the order of the inputs
};

/// Propagates the inputs through `model` to first order. Sensitivities come from `gradient`, else from
/// central differences over ± one standard uncertainty extrapolated to step zero (JCGM 100, 5.1.3 note 2;
/// relative error below 1e-6 for a model that is smooth over that step). Degrees of freedom after Welch and
/// Satterthwaite (JCGM 100, G.4.1): u⁴/Σ u_i⁴/ν_i; correlated inputs enter with their own contribution only,
/// which the formula does not cover strictly; where correlation matters the caller combines them first.
/// Precondition: the model is finite around the inputs, correlations name different inputs.
[[nodiscard]] Propagated propagate(const std::vector<ModelInput>& inputs, const ModelFunction& model,
                                   const std::vector<InputCorrelation>& correlations = {},
                                   const ModelGradient& gradient = {});

/// Covariance of two results of the same inputs, Σ_i Σ_j c_1i c_2j u(x_i, x_j) (JCGM 100, H.2.3, F.1.2.3).
[[nodiscard]] double propagated_covariance(const std::vector<ModelInput>& inputs,
                                           const std::vector<InputCorrelation>& correlations,
                                           const Propagated& first, const Propagated& second);

/// The estimate of a propagated result: value ± t_p(ν_eff)·u (JCGM 100, G.6.4). Where an input has a lopsided
/// interval of its own, each side of the result is combined from the sides of the inputs that drive it there,
/// with the sides' own effective degrees of freedom; for inputs with symmetrical intervals this is ± t·u
/// again. A result that cannot be negative, `positive`, has the interval taken on its logarithm, the same to
/// first order; it does not reach below zero and follows the distribution of a product more closely.
[[nodiscard]] Estimate estimate_of(const Propagated& result, const std::vector<ModelInput>& inputs,
                                   const std::vector<InputCorrelation>& correlations, double confidence_level,
                                   bool positive = false);

}  // namespace ringwright
