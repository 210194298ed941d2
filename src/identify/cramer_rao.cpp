#include "ringwright/cramer_rao.hpp"

#include <Eigen/Core>
#include <cassert>
#include <cmath>
#include <numbers>

#include "ringwright/least_squares.hpp"

namespace ringwright {
namespace {

/// Derivatives of the samples by A, a, ω_d, φ and, where it is not known, the offset.
Eigen::MatrixXd sample_derivatives(const DecayingSinusoid& decay, const SamplingPlan& plan, double rate,
                                   double angular_frequency) {
    const auto count = static_cast<Eigen::Index>(plan.sample_count);
    Eigen::MatrixXd derivatives(count, plan.offset_known ? 4 : 5);
    for (Eigen::Index i = 0; i < count; ++i) {
        const double t = static_cast<double>(i) / plan.sample_rate_hz;
        const double envelope = std::exp(-rate * t);
        const double cosine = envelope * std::cos(angular_frequency * t + decay.phase_rad);
        const double sine = envelope * std::sin(angular_frequency * t + decay.phase_rad);
        derivatives(i, 0) = cosine;
        derivatives(i, 1) = -decay.amplitude * t * cosine;
        derivatives(i, 2) = -decay.amplitude * t * sine;
        derivatives(i, 3) = -decay.amplitude * sine;
    }
    if (!plan.offset_known) derivatives.col(4).setOnes();
    return derivatives;
}

}  // namespace

DecayBound cramer_rao_bound(const DecayingSinusoid& decay, const SamplingPlan& plan) {
    assert(decay.amplitude > 0.0 && decay.natural_frequency_hz > 0.0 && plan.sample_rate_hz > 0.0);
    assert(decay.damping_ratio >= 0.0 && decay.damping_ratio < 1.0 && plan.sample_count > 5);
    const double undamped = 2.0 * std::numbers::pi * decay.natural_frequency_hz;
    const double rate = decay.damping_ratio * undamped;
    const double damped = undamped * std::sqrt(1.0 - decay.damping_ratio * decay.damping_ratio);
    const double noise = plan.noise_standard_deviation;
    const Eigen::MatrixXd covariance =
        covariance_from_jacobian(sample_derivatives(decay, plan, rate, damped), noise * noise);
    assert(covariance.rows() >= 4);
    const Eigen::Matrix2d rate_and_frequency = covariance.block<2, 2>(1, 1);
    // ω_n = √(a² + ω_d²), ζ = a/ω_n
    const Eigen::Vector2d to_undamped(rate / undamped, damped / undamped);
    const Eigen::Vector2d to_ratio(damped * damped / std::pow(undamped, 3),
                                   -rate * damped / std::pow(undamped, 3));
    const auto deviation = [&](const Eigen::Vector2d& gradient) {
        return std::sqrt(gradient.dot(rate_and_frequency * gradient));
    };
    return {std::sqrt(covariance(0, 0)),
            std::sqrt(covariance(1, 1)),
            std::sqrt(covariance(2, 2)),
            std::sqrt(covariance(3, 3)),
            deviation(to_undamped) / (2.0 * std::numbers::pi),
            deviation(to_ratio)};
}

}  // namespace ringwright
