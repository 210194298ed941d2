#include "identify/projected_fit.hpp"

#include <Eigen/QR>
#include <cmath>

#include "ringwright/least_squares.hpp"

namespace ringwright::identify {

using Eigen::Index;
using Eigen::MatrixXd;
using Eigen::VectorXd;

namespace {

constexpr double widest_asinh_damping = 6.0;  // damping ratio 200
constexpr double lowest_asinh_damping = -0.5;
// Beyond critical damping the fast pole is over within one block where it falls by this many nepers there:
// what is faster looks the same, and its derivative vanishes.
constexpr double fastest_fall = 5.0;
constexpr double critical_asinh_damping = 0.881373587019543;

bool usable(const DecayModel& model, const DecaySamples& samples) {
    const double step_s = samples.step_s;
    if (model.release && !(*model.release > 0.0 && *model.release < samples.time(samples.size() - 1)))
        return false;
    for (const Oscillator& o : model.oscillators) {
        if (!(o.asinh_damping < widest_asinh_damping) || !(o.asinh_damping > lowest_asinh_damping) ||
            !(std::abs(o.log_frequency) < 40.0))
            return false;
        if (o.asinh_damping > critical_asinh_damping && o.fastest_rate() * step_s > fastest_fall)
            return false;
    }
    return model.parameters().allFinite();
}

// Whitened residuals of the best linear part, as a function of the nonlinear parameters.
class Projection {
  public:
    Projection(DecayModel model, const DecaySamples& samples, const AutoregressiveNoise& noise)
        : model_(std::move(model)), samples_(samples), noise_(noise), response_(samples.value) {
        whiten(noise_, samples_.stretches, response_);
    }

    void residual_at(const VectorXd& parameters, VectorXd& residual) {
        DecayModel trial = model_;
        trial.set_parameters(parameters);
        if (!usable(trial, samples_)) {  // a wall, so that the step is shortened
            residual.setConstant(1e3 * (1.0 + response_.norm()));
            return;
        }
        project(trial, parameters);
        residual = residual_;
    }

    void jacobian_at(const VectorXd& parameters, MatrixXd& jacobian) {
        DecayModel trial = model_;
        trial.set_parameters(parameters);
        project(trial, parameters);
        jacobian = derivative_columns(trial, samples_, coefficients_);
        whiten(noise_, samples_.stretches, jacobian);
        jacobian.applyOnTheLeft(factor_.householderQ().adjoint());
        jacobian.topRows(model_.linear_count()).setZero();
        jacobian.applyOnTheLeft(factor_.householderQ());
        jacobian = -jacobian;
    }

    [[nodiscard]] ProjectedFit at(const VectorXd& parameters) {
        ProjectedFit fit;
        fit.model = model_;
        fit.model.set_parameters(parameters);
        project(fit.model, parameters);
        fit.coefficients = coefficients_;
        fit.residual_sum = residual_.squaredNorm();
        return fit;
    }

  private:
    // The slopes are mostly wanted where the residuals have just been.
    void project(const DecayModel& trial, const VectorXd& parameters) {
        if (projected_.size() > 0 && projected_ == parameters) return;
        projected_ = parameters;
        MatrixXd columns = linear_columns(trial, samples_);
        whiten(noise_, samples_.stretches, columns);
        factor_.compute(columns);
        coefficients_ = factor_.solve(response_);
        residual_ = response_ - columns * coefficients_;
    }

    DecayModel model_;
    const DecaySamples& samples_;
    const AutoregressiveNoise& noise_;
    VectorXd response_, residual_, coefficients_, projected_;
    Eigen::HouseholderQR<MatrixXd> factor_;
};

}  // namespace

ProjectedFit solve_linear(const DecayModel& model, const DecaySamples& samples,
                          const AutoregressiveNoise& noise) {
    return Projection(model, samples, noise).at(model.parameters());
}

ProjectedFit fit_projected(const DecayModel& start, const DecaySamples& samples,
                           const AutoregressiveNoise& noise, int most_evaluations, double tolerance) {
    Projection projection(start, samples, noise);
    LeastSquaresProblem problem;
    problem.residual_count = samples.size();
    problem.residuals = [&](const VectorXd& at, VectorXd& residual) { projection.residual_at(at, residual); };
    problem.jacobian = [&](const VectorXd& at, MatrixXd& jacobian) { projection.jacobian_at(at, jacobian); };
    LeastSquaresOptions options;
    options.max_evaluations = most_evaluations;
    options.tolerance = tolerance;
    const LeastSquaresFit found = fit_least_squares(problem, start.parameters(), options);
    if (!found.parameters.allFinite()) return projection.at(start.parameters());
    ProjectedFit fit = projection.at(found.parameters);
    fit.converged = found.converged && usable(fit.model, samples);
    return fit;
}

}  // namespace ringwright::identify
