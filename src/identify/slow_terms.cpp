// What moves slowly under a decay: the drift of a sensor, the exponential that an AC-coupled one leaves.

#include <fmt/format.h>

#include <Eigen/QR>
#include <algorithm>
#include <array>
#include <cmath>
#include <numbers>

#include "identify/curve_fit_steps.hpp"
#include "ringwright/distributions.hpp"

namespace ringwright::identify {

using Eigen::Index;
using Eigen::MatrixXd;
using Eigen::VectorXd;

namespace {

constexpr double false_alarm = 1e-3;  // a recording
// Decay rates looked at, over the rate at which the length of the fit is passed once; 0 is a straight line.
constexpr std::array rates_over_length{0.0, 1.0, 3.0, 8.0, 20.0};
constexpr double fastest_over_mode = 3.0;  // over the mode's slowest rate
constexpr double independent_looks = 3.0;  // the rates tried are alike

VectorXd slow_column(const DecaySamples& samples, double rate) {
    const double span = samples.time.maxCoeff();
    return rate > 0.0 ? VectorXd((-rate * samples.time.array()).exp()) : VectorXd(samples.time / span);
}

// Fall of the whitened residual sum, in innovation variances, when the column is added to first order.
double first_order_gain(const CurveFit& fit, const MatrixXd& whitened_basis,
                        const VectorXd& whitened_residual, VectorXd column) {
    const double size = column.norm();
    whiten(fit.noise.noise, fit.samples.stretches, column);
    const VectorXd inside = whitened_basis.transpose() * column;
    column -= whitened_basis * inside;
    if (column.norm() < 1e-6 * size) return 0.0;
    const double along = column.dot(whitened_residual);
    return along * along / column.squaredNorm() / fit.noise.noise.innovation_variance;
}

double criterion_of(const CurveFit& fit) {
    return fit.noise.fit.likelihood_criterion + 2.0 * static_cast<double>(fit.noise.noise.order());
}

struct SlowRate {
    double rate = 0.0, gain = 0.0;
};

SlowRate most_telling_rate(const CurveFit& fit) {
    MatrixXd basis = fit.basis;
    whiten(fit.noise.noise, fit.samples.stretches, basis);
    const Eigen::HouseholderQR<MatrixXd> factor(basis);
    const MatrixXd orthonormal = factor.householderQ() * MatrixXd::Identity(basis.rows(), basis.cols());
    VectorXd residual = fit.residual;
    whiten(fit.noise.noise, fit.samples.stretches, residual);
    SlowRate best;
    const double fastest = fastest_over_mode * fit.oscillator().slowest_rate();
    for (const double over_length : rates_over_length) {
        const double rate = over_length / fit.samples.time.maxCoeff();
        if (rate > fastest) continue;
        const double gain = first_order_gain(fit, orthonormal, residual, slow_column(fit.samples, rate));
        if (gain > best.gain) best = {rate, gain};
    }
    return best;
}

// The same with the noise estimated anew beside each column: a noise model made without a slow term takes it
// for slow noise.
SlowRate most_telling_rate_beside_noise(const CurveFit& fit) {
    SlowRate best;
    const double fastest = fastest_over_mode * fit.oscillator().slowest_rate();
    for (const double over_length : rates_over_length) {
        const double rate = over_length / fit.samples.time.maxCoeff();
        if (rate > fastest) continue;
        MatrixXd columns(fit.basis.rows(), fit.basis.cols() + 1);
        columns << fit.basis, slow_column(fit.samples, rate);
        CurveFit trial = fit;
        if (!estimate_noise(trial, columns, fit.residual, noise_no_higher(fit))) continue;
        const double gain = criterion_of(fit) - criterion_of(trial);
        if (gain > best.gain) best = {rate, gain};
    }
    return best;
}

std::optional<CurveFit> with_drift(const CurveFit& fit) {
    CurveFit trial = fit;
    trial.fit.model.drift = true;
    trial.fit = fit_projected(trial.fit.model, trial.samples, trial.noise.noise);
    if (!trial.fit.converged || !settle(trial)) return std::nullopt;
    return trial;
}

std::optional<CurveFit> with_pole(const CurveFit& fit, double rate) {
    CurveFit trial = fit;
    trial.fit.model.real_poles.push_back(std::log(rate));
    trial.fit = fit_projected(trial.fit.model, trial.samples, trial.noise.noise);
    if (!trial.fit.converged || !settle(trial)) return std::nullopt;
    const double found = std::exp(trial.fit.model.real_poles.back());
    if (found * trial.samples.time.maxCoeff() < 0.3) return std::nullopt;  // a straight line says it better
    return trial;
}

}  // namespace

void add_slow_term(CurveFit& fit) {
    SlowRate slow = most_telling_rate(fit);
    if (fit.noise.noise.order() > 0)
        slow = std::ranges::max(slow, most_telling_rate_beside_noise(fit), {}, &SlowRate::gain);
    if (slow.gain < chi_squared_quantile(1.0 - false_alarm / independent_looks, 1.0)) return;
    const double before = criterion_of(fit);
    const double line_cost = chi_squared_quantile(1.0 - false_alarm / independent_looks, 1.0);
    const double pole_cost = chi_squared_quantile(1.0 - false_alarm / independent_looks, 2.0);
    const std::optional<CurveFit> line = with_drift(fit);
    const double rate = std::max(slow.rate, 1.0 / fit.samples.time.maxCoeff());
    const std::optional<CurveFit> pole = with_pole(fit, rate);
    const double line_gain = line ? before - criterion_of(*line) - line_cost : -1.0;
    const double pole_gain = pole ? before - criterion_of(*pole) - pole_cost : -1.0;
    if (line_gain <= 0.0 && pole_gain <= 0.0) return;
    fit = pole_gain > line_gain ? *pole : *line;
}

void describe_slow_terms(CurveFit& fit) {
    if (fit.fit.model.drift)
        fit.findings.push_back(
            {"drift", Severity::note,
             "The level drifts along a straight line under the decay (temperature, a sensor that "
             "tilts); the drift was fitted together with it."});
    for (const double pole : fit.fit.model.real_poles)
        fit.findings.push_back(
            {"slow_exponential", Severity::note,
             fmt::format(
                 "The level returns with a time constant of {:.3g} s under the decay, as an AC-coupled "
                 "sensor (corner at {:.3g} Hz) or a mount that settles makes it; that was fitted together "
                 "with the decay.",
                 std::exp(-pole), std::exp(pole) / (2.0 * std::numbers::pi))});
}

}  // namespace ringwright::identify
