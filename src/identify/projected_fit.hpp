#pragma once
// Variable projection: the linear part of the decay model eliminated, the nonlinear part by
// Levenberg–Marquardt.

#include <Eigen/Core>

#include "identify/decay_model.hpp"
#include "ringwright/noise_model.hpp"

namespace ringwright::identify {

/// A fitted decay: nonlinear parameters in `model`, linear ones in `coefficients`; the sum is of whitened
/// residuals.
struct ProjectedFit {
    DecayModel model;
    Eigen::VectorXd coefficients;
    double residual_sum = 0.0;
    bool converged = false;
};

/// Best linear part for the model as it stands (generalised least squares under `noise`).
[[nodiscard]] ProjectedFit solve_linear(const DecayModel& model, const DecaySamples& samples,
                                        const AutoregressiveNoise& noise);

/// Variable projection (Golub & Pereyra 1973, Jacobian after Kaufman 1975) by Eigen's Levenberg–Marquardt
/// from the model given. `converged` is false where the steps ran out or the parameters left the range of the
/// model. `tolerance` is relative, of the sum of squares and of the parameters.
[[nodiscard]] ProjectedFit fit_projected(const DecayModel& start, const DecaySamples& samples,
                                         const AutoregressiveNoise& noise, int most_evaluations = 60,
                                         double tolerance = 1e-10);

}  // namespace ringwright::identify
