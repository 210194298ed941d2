#include "ringwright/least_squares.hpp"

#include <Eigen/QR>
#include <cassert>
#include <cmath>
#include <limits>
#include <unsupported/Eigen/LevenbergMarquardt>

namespace ringwright {
namespace {

using Eigen::Index;
using Eigen::MatrixXd;
using Eigen::VectorXd;
namespace status = Eigen::LevenbergMarquardtSpace;

/// The problem in the form that Eigen's module calls.
class Residuals : public Eigen::DenseFunctor<double> {
  public:
    Residuals(const LeastSquaresProblem& problem, Index parameters)
        : DenseFunctor(static_cast<int>(parameters), static_cast<int>(problem.residual_count)),
          problem_(problem) {}

    int operator()(const VectorXd& parameters, VectorXd& residuals) const {
        problem_.residuals(parameters, residuals);
        return 0;
    }
    int df(const VectorXd& parameters, MatrixXd& jacobian) const {
        problem_.jacobian(parameters, jacobian);
        return 0;
    }

  private:
    const LeastSquaresProblem& problem_;
};

VectorXd residuals_at(const LeastSquaresProblem& problem, const VectorXd& parameters) {
    VectorXd residuals(problem.residual_count);
    problem.residuals(parameters, residuals);
    return residuals;
}

MatrixXd jacobian_at(const LeastSquaresProblem& problem, const VectorXd& parameters) {
    MatrixXd jacobian(problem.residual_count, parameters.size());
    problem.jacobian(parameters, jacobian);
    return jacobian;
}

std::string why_not_minimised(status::Status outcome) {
    switch (outcome) {
        case status::TooManyFunctionEvaluation:
            return "The search for the best fit ran out of evaluations.";
        case status::ImproperInputParameters:
            return "There are fewer data than parameters.";
        case status::UserAsked:
        case status::NotStarted:
        case status::Running:
            return "The search for the best fit was broken off.";
        default:
            return {};
    }
}

/// Sum of squares, covariance and degrees of freedom at the parameters found.
void describe_answer(const LeastSquaresProblem& problem, LeastSquaresFit& fit) {
    fit.residual_sum_of_squares = residuals_at(problem, fit.parameters).squaredNorm();
    fit.degrees_of_freedom = static_cast<double>(problem.residual_count - fit.parameters.size());
    if (fit.degrees_of_freedom < 1.0) {
        fit.reason = "There are no more data than parameters, so nothing shows how well they fit.";
        return;
    }
    const double variance = fit.residual_sum_of_squares / fit.degrees_of_freedom;
    fit.residual_standard_deviation = std::sqrt(variance);
    fit.covariance = covariance_from_jacobian(jacobian_at(problem, fit.parameters), variance);
    if (fit.covariance.rows() == 0 && fit.reason.empty())
        fit.reason = "The data do not tell the parameters of the model apart.";
}

}  // namespace

double LeastSquaresFit::standard_deviation(Index parameter) const {
    assert(parameter >= 0 && parameter < covariance.rows());
    return std::sqrt(covariance(parameter, parameter));
}

MatrixXd covariance_from_jacobian(const MatrixXd& jacobian, double variance) {
    const Index parameters = jacobian.cols();
    const VectorXd length = jacobian.colwise().stableNorm();
    if (jacobian.rows() < parameters || !length.allFinite() || (length.array() <= 0.0).any()) return {};
    const MatrixXd scaled = jacobian * length.cwiseInverse().asDiagonal();
    const Eigen::ColPivHouseholderQR<MatrixXd> qr(scaled);
    if (qr.rank() < parameters) return {};
    const MatrixXd upper = qr.matrixR().topLeftCorner(parameters, parameters);
    MatrixXd inverse = upper.triangularView<Eigen::Upper>().solve(MatrixXd::Identity(parameters, parameters));
    inverse = length.cwiseInverse().asDiagonal() * (qr.colsPermutation() * inverse);
    return variance * (inverse * inverse.transpose());
}

LeastSquaresFit fit_least_squares(const LeastSquaresProblem& problem, const VectorXd& start,
                                  const LeastSquaresOptions& options) {
    assert(problem.residuals && problem.jacobian && start.size() > 0);
    LeastSquaresFit fit;
    fit.parameters = start;
    if (problem.residual_count < start.size()) {
        fit.reason = why_not_minimised(status::ImproperInputParameters);
        return fit;
    }
    if (!start.allFinite() || !residuals_at(problem, start).allFinite() ||
        !jacobian_at(problem, start).allFinite()) {
        fit.reason = "The model has no finite value at the start of the search.";
        return fit;
    }
    Residuals functor(problem, start.size());
    Eigen::LevenbergMarquardt<Residuals> search(functor);
    search.setMaxfev(options.max_evaluations);
    search.setXtol(options.tolerance);
    search.setFtol(options.tolerance);
    search.setGtol(0.0);
    search.setFactor(options.first_step);
    fit.reason = why_not_minimised(search.minimize(fit.parameters));
    fit.iterations = static_cast<int>(search.iterations());
    describe_answer(problem, fit);
    fit.converged = fit.reason.empty();
    return fit;
}

}  // namespace ringwright
