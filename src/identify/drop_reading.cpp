#include "identify/drop_reading.hpp"

#include <fmt/format.h>

#include <Eigen/Cholesky>
#include <algorithm>
#include <cmath>
#include <functional>
#include <numbers>
#include <optional>
#include <span>
#include <vector>

#include "identify/fall_reading.hpp"

namespace ringwright::identify {

using Eigen::Index;
using Eigen::Matrix4d;
using Eigen::MatrixXd;
using Eigen::Vector4d;
using Eigen::VectorXd;

namespace {

/// Hold (m), acceleration (m/s², downwards), release and touch (s after the first sample that is looked at).
struct FallShape {
    double hold = 0.0, acceleration = 0.0, release = 0.0, touch = 0.0;
    [[nodiscard]] Vector4d vector() const { return {hold, acceleration, release, touch}; }
    static FallShape of(const Vector4d& v) { return {v(0), v(1), v(2), v(3)}; }
    [[nodiscard]] double speed() const { return acceleration * (touch - release); }
    [[nodiscard]] double height() const { return 0.5 * speed() * (touch - release); }
    [[nodiscard]] double at(double t, const Support& support) const {
        if (t <= release) return hold;
        if (t <= touch) return hold + 0.5 * acceleration * (t - release) * (t - release);
        // The spring begins to push at the touch, so that gravity alone acts there but for the damper: the
        // mass swings about a place that lies a/ω² below, wherever it comes to rest in the end.
        const double sag = acceleration / (support.angular_frequency * support.angular_frequency);
        return hold + height() + sag + support.motion(-sag, speed(), t - touch);
    }
};

/// The samples about the fall, downwards positive.
struct FallSamples {
    std::vector<double> time, way;
};

FallSamples samples_of(const Recording& recording, std::size_t begin, std::size_t end, double down) {
    FallSamples samples;
    for (std::size_t i = begin; i < end; ++i) {
        samples.time.push_back(recording.clock.time_of(i) - recording.clock.time_of(begin));
        samples.way.push_back(down * recording.samples[i]);
    }
    return samples;
}

VectorXd residuals(const FallSamples& samples, const FallShape& shape, const Support& support) {
    VectorXd r(static_cast<Index>(samples.time.size()));
    for (Index i = 0; i < r.size(); ++i) {
        const auto k = static_cast<std::size_t>(i);
        r(i) = samples.way[k] - shape.at(samples.time[k], support);
    }
    return r;
}

MatrixXd derivatives(const FallSamples& samples, const FallShape& shape, const Support& support,
                     const Vector4d& steps) {
    MatrixXd jacobian(static_cast<Index>(samples.time.size()), 4);
    for (Index j = 0; j < 4; ++j) {
        Vector4d more = shape.vector(), less = more;
        more(j) += steps(j), less(j) -= steps(j);
        jacobian.col(j) = (residuals(samples, FallShape::of(less), support) -
                           residuals(samples, FallShape::of(more), support)) /
                          (2.0 * steps(j));
    }
    return jacobian;
}

struct FallFit {
    FallShape shape;
    Matrix4d covariance = Matrix4d::Zero();
    double degrees_of_freedom = 1.0;
};

/// By how much neighbours that go together widen an uncertainty: (1 + ρ)/(1 − ρ) of the variance. Four
/// numbers fitted to a short stretch take some of that away, so that the noise of the decay counts where it
/// is more.
double correlation_factor(const VectorXd& r) {
    const Index n = r.size();
    const double squares = r.squaredNorm();
    const double rho = squares > 0.0 ? r.head(n - 1).dot(r.tail(n - 1)) / squares : 0.0;
    const double bounded = std::clamp(rho, 0.0, 0.95);
    return (1.0 + bounded) / (1.0 - bounded);
}

/// Levenberg and Marquardt on the four numbers; `noise_density` of RestingDecay.
std::optional<FallFit> fit_fall(const FallSamples& samples, FallShape shape, const Support& support,
                                double noise_density) {
    constexpr int most_steps = 60;
    const double time = shape.touch - shape.release;
    const Vector4d steps{1e-5 * std::abs(shape.height()), 1e-5 * shape.acceleration, 1e-5 * time,
                         1e-5 * time};
    VectorXd r = residuals(samples, shape, support);
    double damping = 1e-3;
    MatrixXd jacobian = derivatives(samples, shape, support, steps);
    for (int step = 0; step < most_steps && damping < 1e8; ++step) {
        Matrix4d normal = jacobian.transpose() * jacobian;
        normal.diagonal() *= 1.0 + damping;
        const Vector4d move = normal.ldlt().solve(jacobian.transpose() * r);
        const FallShape tried = FallShape::of(shape.vector() + move);
        const VectorXd after = residuals(samples, tried, support);
        if (!(after.squaredNorm() < r.squaredNorm())) {
            damping *= 8.0;
            continue;
        }
        const bool settled = after.squaredNorm() > (1.0 - 1e-9) * r.squaredNorm();
        shape = tried, r = after, damping *= 0.2;
        jacobian = derivatives(samples, shape, support, steps);
        if (settled) break;
    }
    const auto spare = static_cast<double>(r.size()) - 4.0;
    if (spare < 4.0 || !(shape.touch > shape.release) || !(shape.acceleration > 0.0)) return {};
    const double step =
        (samples.time.back() - samples.time.front()) / static_cast<double>(samples.time.size() - 1);
    const double inflation =
        std::max(correlation_factor(r), noise_density * spare / (step * std::max(r.squaredNorm(), 1e-300)));
    FallFit fit{shape, {}, std::max(1.0, spare / inflation)};
    const Matrix4d normal = jacobian.transpose() * jacobian;
    fit.covariance = r.squaredNorm() / spare * inflation * normal.ldlt().solve(Matrix4d::Identity());
    return fit;
}

/// The parabola between two samples of the fall: where it begins at rest, how it bends.
std::optional<FallShape> first_shape(const FallSamples& samples, double begin_s, double end_s,
                                     const Support& support, double gravity) {
    const double inner = 0.15 * (end_s - begin_s), middle = 0.5 * (begin_s + end_s);
    std::vector<std::size_t> used;
    for (std::size_t k = 0; k < samples.time.size(); ++k)
        if (samples.time[k] > begin_s + inner && samples.time[k] < end_s - inner) used.push_back(k);
    if (used.size() < 5) return {};
    Eigen::MatrixX3d design(static_cast<Index>(used.size()), 3);
    VectorXd way(design.rows());
    for (Index i = 0; i < design.rows(); ++i) {
        const std::size_t k = used[static_cast<std::size_t>(i)];
        const double x = samples.time[k] - middle;
        design.row(i) << 1.0, x, x * x;
        way(i) = samples.way[k];
    }
    const Eigen::Vector3d c = (design.transpose() * design).ldlt().solve(design.transpose() * way);
    if (!(c(2) > 0.0)) return {};
    const double release = middle - 0.5 * c(1) / c(2), hold = c(0) - 0.25 * c(1) * c(1) / c(2);
    const double touch_level =
        support.level - gravity / (support.angular_frequency * support.angular_frequency);
    const double touch = touch_level > hold ? release + std::sqrt((touch_level - hold) / c(2)) : end_s;
    return FallShape{hold, 2.0 * c(2), release, touch};
}

/// The fall and the time after it in which the mass is on the spring for certain: until it has come to the
/// lowest point and some way back.
struct FallWindow {
    std::size_t begin = 0, end = 0;
    double fall_begin_s = 0.0, fall_end_s = 0.0;  ///< after `begin`
};

FallWindow window_of(const Recording& recording, const Event& event, double angular_frequency) {
    constexpr double share_of_cycle = 0.3;
    const SampleRange& fall = event.flights.front();
    const double rate = recording.clock.sample_rate_hz;
    const std::size_t time = fall.end - fall.begin;
    const double after = share_of_cycle * 2.0 * std::numbers::pi / angular_frequency * rate;
    FallWindow window;
    window.begin = fall.begin - std::min(fall.begin, time);
    window.end = std::min(recording.size(), fall.end + static_cast<std::size_t>(std::ceil(after)));
    const double origin = recording.clock.time_of(window.begin);
    window.fall_begin_s = recording.clock.time_of(fall.begin) - origin;
    window.fall_end_s = recording.clock.time_of(std::min(fall.end, recording.size() - 1)) - origin;
    return window;
}

double square(double value) {
    return value * value;
}

/// Standard uncertainty of `value`: noise, and what the decay's own uncertainty does.
double uncertainty_of(const FallFit& fit, const std::vector<std::pair<FallFit, Support>>& moved,
                      const Support& support,
                      const std::function<double(const FallShape&, const Support&)>& value) {
    Vector4d gradient;
    for (Index j = 0; j < 4; ++j) {
        const double step = std::max(1e-3 * std::sqrt(std::abs(fit.covariance(j, j))), 1e-12);
        Vector4d more = fit.shape.vector(), less = more;
        more(j) += step, less(j) -= step;
        gradient(j) =
            (value(FallShape::of(more), support) - value(FallShape::of(less), support)) / (2.0 * step);
    }
    double variance = gradient.dot(fit.covariance * gradient);
    const double here = value(fit.shape, support);
    for (const auto& [other, at] : moved) variance += square(value(other.shape, at) - here);
    return std::sqrt(std::max(variance, 0.0));
}

/// The fall of a displacement: fitted with the decay as it was identified, and again with each of what the
/// decay tells moved by its standard uncertainty.
struct FallSeen {
    FallFit fit;
    Support support;
    std::vector<std::pair<FallFit, Support>> moved;

    using Value = std::function<double(const FallShape&, const Support&)>;
    [[nodiscard]] double value(const Value& of) const { return of(fit.shape, support); }
    [[nodiscard]] double uncertainty(const Value& of) const {
        return uncertainty_of(fit, moved, support, of);
    }
};

std::optional<FallSeen> fall_seen(const Recording& recording, const Event& event, const RestingDecay& decay,
                                  double gravity) {
    const double omega = 2.0 * std::numbers::pi * decay.natural_frequency.value;
    const double down = decay.level > recording.samples[event.flights.front().begin] ? 1.0 : -1.0;
    const FallWindow window = window_of(recording, event, omega);
    const FallSamples samples = samples_of(recording, window.begin, window.end, down);
    const Support support{omega, decay.damping_ratio.value, down * decay.level};
    const auto first = first_shape(samples, window.fall_begin_s, window.fall_end_s, support, gravity);
    const auto fit = first ? fit_fall(samples, *first, support, decay.noise_density) : std::nullopt;
    if (!fit) return {};
    FallSeen seen{*fit, support, {}};
    const auto move = [&](const Support& to) {
        if (const auto other = fit_fall(samples, fit->shape, to, decay.noise_density))
            seen.moved.emplace_back(*other, to);
    };
    const double frequency_off = decay.natural_frequency.standard_uncertainty / decay.natural_frequency.value;
    move({omega * (1.0 + frequency_off), support.damping_ratio, support.level});
    move({omega, support.damping_ratio + decay.damping_ratio.standard_uncertainty, support.level});
    move({omega, support.damping_ratio, support.level + decay.level_standard_uncertainty});
    return seen;
}

double deflection_of(const FallShape& shape, const Support& on) {
    return on.level - shape.hold - shape.height();
}

Quantities fall_quantities(const FallSeen& seen, double confidence) {
    Quantities quantities;
    const auto put = [&](Quantity quantity, const FallSeen::Value& value) {
        const double at = seen.value(value);
        if (at > 0.0)
            quantities[quantity] =
                estimate_of_reading(at, seen.uncertainty(value), seen.fit.degrees_of_freedom, confidence);
    };
    put(Quantity::drop_height, [](const FallShape& s, const Support&) { return s.height(); });
    put(Quantity::contact_velocity, [](const FallShape& s, const Support&) { return s.speed(); });
    put(Quantity::static_deflection, deflection_of);
    return quantities;
}

std::optional<Finding> fall_against_gravity(const FallSeen& seen, const Gravity& gravity) {
    const auto acceleration = [](const FallShape& s, const Support&) { return s.acceleration; };
    const double off =
        std::hypot(seen.uncertainty(acceleration), gravity.standard_uncertainty) / gravity.value;
    if (!disagrees(seen.value(acceleration) / gravity.value, off, seen.fit.degrees_of_freedom)) return {};
    return fall_finding(seen.value(acceleration), gravity.value, "The mass falls with");
}

std::optional<Finding> deflection_against_frequency(const FallSeen& seen, const Gravity& gravity) {
    // Deflection over that of the frequency, not the other way round: its error is that of a difference of
    // places, as likely up as down however large.
    const auto softer = [&](const FallShape& shape, const Support& on) {
        return deflection_of(shape, on) * square(on.angular_frequency) / gravity.value;
    };
    const double ratio = seen.value(softer);
    const double off = std::hypot(seen.uncertainty(softer), gravity.standard_uncertainty / gravity.value);
    if (!(ratio > 0.0) || !disagrees(ratio, off, seen.fit.degrees_of_freedom)) return {};
    return Finding{
        "static_deflection_disagrees", Severity::caution,
        fmt::format("Gravity over the static deflection gives a stiffness per mass {} than the ringing "
                    "does. A spring that is not straight, a preload, friction that holds the mass off "
                    "its rest position, or a sensor that does not see the foot of the spring does that.",
                    percent(1.0 / ratio - 1.0))};
}

DropReading read_displacement(const Recording& recording, const Event& event, const RestingDecay& decay,
                              const Gravity& gravity, double confidence) {
    const auto seen = fall_seen(recording, event, decay, gravity.value);
    if (!seen) return {};
    DropReading reading{fall_quantities(*seen, confidence), {}};
    // With a wrong scale the deflection is wrong as well, and says nothing more.
    auto finding = fall_against_gravity(*seen, gravity);
    if (!finding) finding = deflection_against_frequency(*seen, gravity);
    if (finding) reading.findings.push_back(std::move(*finding));
    return reading;
}

}  // namespace

RestingDecay resting_decay(const CurveFit& fit, const Quantities& quantities) {
    RestingDecay decay;
    decay.natural_frequency = quantities.at(Quantity::natural_frequency);
    decay.damping_ratio = quantities.at(Quantity::damping_ratio);
    decay.level = fit.fit.coefficients(0) * fit.samples.scale;
    VectorXd gradient = VectorXd::Zero(fit.map.rows());
    gradient(0) = 1.0;
    decay.level_standard_uncertainty = spread_of(fit, gradient).scale * fit.samples.scale;
    decay.noise_density =
        fit.noise.noise.spectral_density(0.0) * fit.samples.step_s * square(fit.samples.scale);
    return decay;
}

DropReading read_drop(const Recording& recording, const Event& event, const RestingDecay& decay,
                      const Gravity& gravity, double confidence_level) {
    if (event.flights.empty() || !recording.scaled) return {};
    if (recording.quantity == MeasuredQuantity::acceleration)
        return read_acceleration(recording, event, decay, gravity, confidence_level);
    if (recording.quantity == MeasuredQuantity::displacement && event.hold_seen)
        return read_displacement(recording, event, decay, gravity, confidence_level);
    return {};
}

}  // namespace ringwright::identify
