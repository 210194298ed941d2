#pragma once
// Nonlinear least squares with the covariance of its answer.

#include <Eigen/Core>
#include <functional>
#include <string>

namespace ringwright {

/// A model and its data as residuals r_i(parameters), i = 0 … residual_count − 1, and their derivatives.
/// Weights belong inside the residuals. Where the model does not exist a residual may be NaN or infinite: the
/// search then takes a shorter step. Both functions get vectors and matrices of the right size and fill them.
struct LeastSquaresProblem {
    Eigen::Index residual_count = 0;
    std::function<void(const Eigen::VectorXd& parameters, Eigen::VectorXd& residuals)> residuals;
    /// jacobian(i, j) = ∂r_i/∂parameter_j, analytic: differences of residuals spoil the covariance.
    std::function<void(const Eigen::VectorXd& parameters, Eigen::MatrixXd& jacobian)> jacobian;
};

struct LeastSquaresOptions {
    /// Evaluations of the residuals before the search gives up; hard certified problems take some hundreds.
    int max_evaluations = 2000;
    /// Stop when the step is this small relative to the parameters, or when actual and predicted reduction of
    /// the sum of squares are both this small relative to it. Double precision holds a sum of squares to
    /// about 1e-16 relative; 1e-14 stops before the search wanders in rounding.
    double tolerance = 1e-14;
    /// Bound of the first step as a multiple of the scaled length of the start (MINPACK's factor, 0.1 … 100).
    /// 1 keeps the first step of the order of the start; smaller for a start that is good, larger for none.
    double first_step = 1.0;
};

/// The answer. Assumes independent residuals of equal, unknown variance; correlated noise makes the
/// covariance wrong (mostly too small), so whiten first.
struct LeastSquaresFit {
    Eigen::VectorXd parameters;
    /// s² (JᵀJ)⁻¹ at the answer; no rows when the data do not tell the parameters apart or no degree of
    /// freedom is left.
    Eigen::MatrixXd covariance;
    double residual_sum_of_squares = 0.0;
    double residual_standard_deviation = 0.0;  ///< s = √(sum of squares / degrees of freedom)
    double degrees_of_freedom = 0.0;           ///< residuals minus parameters
    int iterations = 0;
    bool converged = false;  ///< a minimum was reached and the covariance exists
    std::string reason;      ///< why not, in a sentence; empty when converged

    /// √covariance(j, j). Precondition: the covariance exists.
    [[nodiscard]] double standard_deviation(Eigen::Index parameter) const;
};

/// Minimises the sum of squared residuals from `start` by the Levenberg–Marquardt method in the form of Moré
/// (1978), on Eigen's module. Never throws for what is in the data: where the start has no finite residuals,
/// the evaluations run out, or parameters cannot be told apart, `converged` is false and `reason` says which.
/// Accuracy: the certified parameters and standard deviations of the NIST StRD nonlinear problems
/// (tests/checks/test_nist_nonlinear.cpp).
[[nodiscard]] LeastSquaresFit fit_least_squares(const LeastSquaresProblem& problem,
                                                const Eigen::VectorXd& start,
                                                const LeastSquaresOptions& options = {});

/// variance · (JᵀJ)⁻¹ by pivoted QR of J with its columns scaled to length one, which keeps the digits that
/// forming JᵀJ, or very different column lengths, would lose. No rows when the columns are linearly dependent
/// to rounding, or not finite.
[[nodiscard]] Eigen::MatrixXd covariance_from_jacobian(const Eigen::MatrixXd& jacobian, double variance);

}  // namespace ringwright
