#include "identify/projected_fit.hpp"

#include <Eigen/QR>
#include <cmath>
#include <unsupported/Eigen/NonLinearOptimization>

namespace ringwright::identify {

using Eigen::Index;
using Eigen::MatrixXd;
using Eigen::VectorXd;

namespace {

constexpr double widest_asinh_damping = 6.0;  // damping ratio 200
constexpr double lowest_asinh_damping = -0.5;

bool usable(const DecayModel& model) {
    for (const Oscillator& o : model.oscillators)
        if (!(o.asinh_damping < widest_asinh_damping) || !(o.asinh_damping > lowest_asinh_damping) ||
            !(std::abs(o.log_frequency) < 40.0))
            return false;
    return model.parameters().allFinite();
}

// The functor that Eigen's Levenberg–Marquardt asks for.
class Projection {
  public:
    Projection(DecayModel model, const DecaySamples& samples, const AutoregressiveNoise& noise)
        : model_(std::move(model)), samples_(samples), noise_(noise), response_(samples.value) {
        whiten(noise_, samples_.stretches, response_);
    }

    [[nodiscard]] int inputs() const { return static_cast<int>(model_.nonlinear_count()); }
    [[nodiscard]] int values() const { return static_cast<int>(samples_.size()); }

    int operator()(const VectorXd& parameters, VectorXd& residual) {
        DecayModel trial = model_;
        trial.set_parameters(parameters);
        if (!usable(trial)) {  // a wall, so that the step is shortened
            residual.setConstant(1e3 * (1.0 + response_.norm()));
            return 0;
        }
        project(trial);
        residual = residual_;
        return 0;
    }

    int df(const VectorXd& parameters, MatrixXd& jacobian) {
        DecayModel trial = model_;
        trial.set_parameters(parameters);
        project(trial);
        jacobian = derivative_columns(trial, samples_, coefficients_);
        whiten(noise_, samples_.stretches, jacobian);
        jacobian.applyOnTheLeft(factor_.householderQ().adjoint());
        jacobian.topRows(model_.linear_count()).setZero();
        jacobian.applyOnTheLeft(factor_.householderQ());
        jacobian = -jacobian;
        return 0;
    }

    [[nodiscard]] ProjectedFit at(const VectorXd& parameters) {
        ProjectedFit fit;
        fit.model = model_;
        fit.model.set_parameters(parameters);
        project(fit.model);
        fit.coefficients = coefficients_;
        fit.residual_sum = residual_.squaredNorm();
        return fit;
    }

  private:
    void project(const DecayModel& trial) {
        MatrixXd columns = linear_columns(trial, samples_);
        whiten(noise_, samples_.stretches, columns);
        factor_.compute(columns);
        coefficients_ = factor_.solve(response_);
        residual_ = response_ - columns * coefficients_;
    }

    DecayModel model_;
    const DecaySamples& samples_;
    const AutoregressiveNoise& noise_;
    VectorXd response_, residual_, coefficients_;
    Eigen::HouseholderQR<MatrixXd> factor_;
};

}  // namespace

ProjectedFit solve_linear(const DecayModel& model, const DecaySamples& samples,
                          const AutoregressiveNoise& noise) {
    return Projection(model, samples, noise).at(model.parameters());
}

ProjectedFit fit_projected(const DecayModel& start, const DecaySamples& samples,
                           const AutoregressiveNoise& noise, int most_evaluations) {
    namespace lm = Eigen::LevenbergMarquardtSpace;
    Projection projection(start, samples, noise);
    Eigen::LevenbergMarquardt<Projection> solver(projection);
    solver.parameters.maxfev = most_evaluations;
    solver.parameters.xtol = 1e-9;
    solver.parameters.ftol = 1e-10;
    solver.parameters.factor = 1.0;
    VectorXd parameters = start.parameters();
    const auto status = solver.minimize(parameters);
    ProjectedFit fit = projection.at(parameters);
    fit.converged =
        status != lm::ImproperInputParameters && status != lm::TooManyFunctionEvaluation && usable(fit.model);
    return fit;
}

}  // namespace ringwright::identify
