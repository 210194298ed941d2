#include "identify/decay_quantities.hpp"

#include <Eigen/Cholesky>
#include <Eigen/QR>
#include <algorithm>
#include <array>
#include <cmath>
#include <functional>
#include <numbers>

#include "ringwright/distributions.hpp"

namespace ringwright::identify {

using Eigen::Index;
using Eigen::Matrix2d;
using Eigen::MatrixXd;
using Eigen::Vector2d;
using Eigen::VectorXd;

namespace {

constexpr double two_pi = 2.0 * std::numbers::pi;

// A quantity as a function of (z, w), in the scale in which its error is most nearly symmetrical.
struct Derived {
    Quantity quantity;
    double (*value)(const Oscillator&);
    bool logarithmic;
};

double damping_ratio(const Oscillator& o) {
    return o.damping_ratio();
}
double natural_frequency(const Oscillator& o) {
    return o.angular_frequency() / two_pi;
}
double damped_frequency(const Oscillator& o) {
    return o.damped_frequency_hz();
}
double decay_rate(const Oscillator& o) {
    return o.decay_rate();
}
double slow_decay_rate(const Oscillator& o) {
    return o.angular_frequency() / (2.0 * o.damping_ratio());
}

constexpr double critical = 1.0;  // beyond it the slow decay rate is a quantity of its own

constexpr std::array basic{
    Derived{Quantity::natural_frequency, natural_frequency, true},
    Derived{Quantity::damping_ratio, damping_ratio, false},
    Derived{Quantity::decay_rate, decay_rate, false},
    Derived{Quantity::damped_frequency, damped_frequency, false},
    Derived{Quantity::slow_decay_rate, slow_decay_rate, true},
};

Oscillator moved(const Oscillator& o, const Vector2d& by) {
    return {o.asinh_damping + by(0), o.log_frequency + by(1)};
}

Vector2d gradient_of(const Derived& derived, const Oscillator& at) {
    constexpr double step = 1e-6;
    Vector2d gradient;
    for (Index i = 0; i < 2; ++i) {
        Vector2d by = Vector2d::Zero();
        by(i) = step;
        gradient(i) = (derived.value(moved(at, by)) - derived.value(moved(at, -by))) / (2.0 * step);
    }
    return gradient;
}

Spread spread_of_oscillator(const CurveFit& fit, std::size_t index, const Vector2d& gradient) {
    VectorXd full = VectorXd::Zero(fit.map.rows());
    full.segment(fit.linear_count() + 2 * static_cast<Index>(index), 2) = gradient;
    return spread_of(fit, full);
}

// Whitened residual sum with the oscillator held at one place and everything else at its best: nuisance
// nonlinear parameters enter by their derivative columns.
class Profile {
  public:
    Profile(const CurveFit& fit, std::size_t index) : fit_(fit), index_(index) {
        response_ = fit.samples.value;
        whiten(fit.noise.noise, fit.samples.stretches, response_);
        const MatrixXd derivatives = derivative_columns(fit.fit.model, fit.samples, fit.fit.coefficients);
        nuisance_.resize(derivatives.rows(), derivatives.cols() - 2);
        for (Index c = 0, at = 0; c < derivatives.cols(); ++c)
            if (c / 2 != static_cast<Index>(index) ||
                c >= 2 * static_cast<Index>(fit.fit.model.oscillators.size()))
                nuisance_.col(at++) = derivatives.col(c);
        unit_ = fit.noise.noise.innovation_variance;
        least_ = residual_sum(fit.fit.model.oscillators[index]);
    }

    /// Rise of the residual sum in units of the innovation variance.
    [[nodiscard]] double rise(const Vector2d& by) const {
        return (residual_sum(moved(fit_.fit.model.oscillators[index_], by)) - least_) / unit_;
    }

  private:
    [[nodiscard]] double residual_sum(const Oscillator& oscillator) const {
        DecayModel model = fit_.fit.model;
        model.oscillators[index_] = oscillator;
        const MatrixXd linear = linear_columns(model, fit_.samples);
        MatrixXd design(linear.rows(), linear.cols() + nuisance_.cols());
        design << linear, nuisance_;
        whiten(fit_.noise.noise, fit_.samples.stretches, design);
        const Eigen::HouseholderQR<MatrixXd> factor(design);
        VectorXd rotated = response_;
        rotated.applyOnTheLeft(factor.householderQ().adjoint());
        return rotated.tail(rotated.size() - design.cols()).squaredNorm();
    }

    const CurveFit& fit_;
    std::size_t index_;
    VectorXd response_;
    MatrixXd nuisance_;
    double unit_ = 1.0, least_ = 0.0;
};

constexpr double straight_enough =
    0.04;  // relative departure of the rise from a parabola at the interval's ends
constexpr int directions = 24;
constexpr double farthest = 60.0;  // times the straight-line distance: then there is no end

// Distance along `direction` at which the profile has risen by `target`² (direction has unit rise per unit
// length squared where the problem is straight). Infinite where it never does.
double distance_to_rise(const Profile& profile, const Vector2d& direction, double target) {
    const auto root_of_rise = [&](double distance) {
        const double rise = profile.rise(distance * direction);
        return std::isfinite(rise) ? std::sqrt(std::max(0.0, rise)) : 1e6;
    };
    double low = 0.0, low_value = 0.0, high = target, high_value = root_of_rise(high);
    while (high_value < target) {
        low = high;
        low_value = high_value;
        high *= 1.6;
        if (high > farthest * target) return std::numeric_limits<double>::infinity();
        high_value = root_of_rise(high);
    }
    for (int i = 0; i < 12 && high - low > 2e-3 * target; ++i) {
        double middle = low + (target - low_value) / (high_value - low_value) * (high - low);
        if (i > 2 || !(middle > low && middle < high)) middle = 0.5 * (low + high);
        const double value = root_of_rise(middle);
        if (std::abs(value - target) < 1e-3 * target) return middle;
        (value < target ? low : high) = middle;
        (value < target ? low_value : high_value) = value;
    }
    return 0.5 * (low + high);
}

// Points of the region's edge, by direction.
struct Edge {
    std::vector<Vector2d> points;  // moves of (z, w); empty where the region has no end in that direction
    bool closed = true;
};

Edge trace_edge(const Profile& profile, const Matrix2d& root, double target) {
    Edge edge;
    for (int i = 0; i < directions; ++i) {
        const double angle = two_pi * i / directions;
        const Vector2d direction = root * Vector2d(std::cos(angle), std::sin(angle));
        const double distance = distance_to_rise(profile, direction, target);
        edge.closed = edge.closed && std::isfinite(distance);
        edge.points.push_back((std::isfinite(distance) ? distance : farthest * target) * direction);
    }
    return edge;
}

// Largest value of `measure` on the edge, refined by the parabola through the three points about the largest.
double largest_on(const Edge& edge, const std::function<double(const Vector2d&)>& measure) {
    std::vector<double> values;
    for (const Vector2d& point : edge.points) values.push_back(measure(point));
    const auto peak = static_cast<std::size_t>(std::ranges::max_element(values) - values.begin());
    const std::size_t n = values.size();
    const double left = values[(peak + n - 1) % n], middle = values[peak], right = values[(peak + 1) % n];
    const double bend = left - 2.0 * middle + right;
    if (!(bend < 0.0)) return middle;
    return middle - 0.125 * (left - right) * (left - right) / bend;
}

struct Region {
    Edge edge;
    double factor = 0.0;  // the t factor it was traced for
    bool curved = false;
};

Matrix2d joint_covariance(const CurveFit& fit, std::size_t index) {
    const MatrixXd rows = fit.map.middleRows(fit.linear_count() + 2 * static_cast<Index>(index), 2);
    return fit.noise.noise.innovation_variance * rows * fit.noise.fit.unit_covariance * rows.transpose();
}

Region trace_region(const CurveFit& fit, std::size_t index, double factor) {
    Region region;
    region.factor = factor;
    const Matrix2d covariance = joint_covariance(fit, index);
    const Eigen::LLT<Matrix2d> root(covariance);
    if (root.info() != Eigen::Success) return region;
    const Profile profile(fit, index);
    const Matrix2d lower = root.matrixL();
    for (const Vector2d& axis :
         {Vector2d(1.0, 0.0), Vector2d(0.0, 1.0), Vector2d(0.7071, 0.7071), Vector2d(0.7071, -0.7071)})
        for (const double sign : {1.0, -1.0}) {
            const double rise = profile.rise(sign * factor * (lower * axis));
            region.curved = region.curved || !(std::abs(rise / (factor * factor) - 1.0) < straight_enough);
        }
    if (region.curved) region.edge = trace_edge(profile, lower, factor);
    return region;
}

Estimate straight_estimate(const Derived& derived, const Oscillator& at, const Spread& spread,
                           double confidence_level) {
    Estimate estimate;
    estimate.value = derived.value(at);
    estimate.standard_uncertainty = spread.scale;
    estimate.degrees_of_freedom = spread.degrees_of_freedom;
    const double reach = student_t_factor(confidence_level, spread.degrees_of_freedom) * spread.scale;
    if (derived.logarithmic && estimate.value > 0.0) {
        const double ratio = std::exp(reach / estimate.value);
        estimate.interval = {estimate.value / ratio, estimate.value * ratio};
    } else {
        estimate.interval = {estimate.value - reach, estimate.value + reach};
    }
    return estimate;
}

// The profile region was traced for the noise as estimated; its half-widths are stretched by what it cost to
// estimate it.
void bend_interval(Estimate& estimate, const Derived& derived, const CurveFit& fit, std::size_t index,
                   const Region& region, double plain_scale, double confidence_level) {
    const Oscillator& at = fit.fit.model.oscillators[index];
    const double wanted = student_t_factor(confidence_level, estimate.degrees_of_freedom) *
                          estimate.standard_uncertainty / plain_scale;
    const double stretch = wanted / region.factor;
    const auto scaled = [&](const Vector2d& point) { return derived.value(moved(at, stretch * point)); };
    estimate.interval.high = largest_on(region.edge, scaled);
    estimate.interval.low = -largest_on(region.edge, [&](const Vector2d& p) { return -scaled(p); });
    if (!region.edge.closed) {
        // Only a quantity that hardly moves along the open direction still has an end.
        const double width = estimate.interval.high - estimate.interval.low;
        if (width > 50.0 * estimate.standard_uncertainty + 2.0 * std::abs(estimate.value))
            estimate.interval.high = std::numeric_limits<double>::infinity();
    }
}

bool exists(const Derived& derived, const Oscillator& o) {
    if (derived.quantity == Quantity::slow_decay_rate) return o.damping_ratio() > critical;
    if (derived.quantity == Quantity::damped_frequency) return std::abs(o.damping_ratio()) < 1.0;
    return true;
}

Estimate through(const Estimate& of, double (*function)(double), double slope) {
    Estimate estimate = of;
    estimate.value = function(of.value);
    estimate.standard_uncertainty = std::abs(slope) * of.standard_uncertainty;
    const double a = function(of.interval.low), b = function(of.interval.high);
    estimate.interval = {std::min(a, b), std::max(a, b)};
    return estimate;
}

double decrement_of(double zeta) {
    return zeta < 1.0 ? two_pi * zeta / std::sqrt(1.0 - zeta * zeta) : 1e300;
}
double loss_factor_of(double zeta) {
    return 2.0 * zeta;
}
double quality_factor_of(double zeta) {
    return 0.5 / zeta;
}

// Far beyond critical damping, or with much noise, the fast pole has no end: then frequency and damping ratio
// are not told.
void drop_undetermined(Quantities& quantities) {
    constexpr double widest_ratio = 30.0;
    const auto ratio = quantities.find(Quantity::damping_ratio);
    const auto frequency = quantities.find(Quantity::natural_frequency);
    const bool ratio_open =
        ratio == quantities.end() || ratio->second.interval.high > 3.0 + 10.0 * std::abs(ratio->second.value);
    const bool frequency_open =
        frequency == quantities.end() || !(frequency->second.interval.low > 0.0) ||
        frequency->second.interval.high > widest_ratio * frequency->second.interval.low;
    if (!ratio_open && !frequency_open) return;
    for (const Quantity q : {Quantity::damping_ratio, Quantity::natural_frequency, Quantity::decay_rate,
                             Quantity::damped_frequency})
        quantities.erase(q);
    const auto slow = quantities.find(Quantity::slow_decay_rate);
    if (slow != quantities.end() && slow->second.interval.high > widest_ratio * slow->second.interval.low)
        quantities.erase(slow);
}

void add_functions_of_damping(Quantities& quantities) {
    const auto found = quantities.find(Quantity::damping_ratio);
    if (found == quantities.end()) return;
    const Estimate zeta = found->second;
    quantities[Quantity::loss_factor] = through(zeta, loss_factor_of, 2.0);
    if (zeta.interval.high < 1.0 && zeta.value > -1.0)
        quantities[Quantity::logarithmic_decrement] =
            through(zeta, decrement_of, two_pi / std::pow(1.0 - zeta.value * zeta.value, 1.5));
    if (zeta.interval.low > 0.0)
        quantities[Quantity::quality_factor] =
            through(zeta, quality_factor_of, 0.5 / (zeta.value * zeta.value));
}

}  // namespace

Quantities decay_quantities(const CurveFit& fit, std::size_t index, double confidence_level) {
    const Oscillator& at = fit.fit.model.oscillators[index];
    const Matrix2d covariance = joint_covariance(fit, index);
    Quantities quantities;
    std::optional<Region> region;
    for (const Derived& derived : basic) {
        if (!exists(derived, at)) continue;
        const Vector2d gradient = gradient_of(derived, at);
        const Spread spread = spread_of_oscillator(fit, index, gradient);
        if (!std::isfinite(spread.scale) || spread.scale <= 0.0) continue;
        Estimate estimate = straight_estimate(derived, at, spread, confidence_level);
        const double plain = std::sqrt(gradient.dot(covariance * gradient));
        if (!region) {
            const double factor =
                student_t_factor(confidence_level, spread.degrees_of_freedom) * spread.scale / plain;
            region = trace_region(fit, index, factor);
        }
        if (region->curved) bend_interval(estimate, derived, fit, index, *region, plain, confidence_level);
        if (!std::isfinite(estimate.interval.low) || !std::isfinite(estimate.interval.high)) continue;
        quantities[derived.quantity] = estimate;
    }
    drop_undetermined(quantities);
    add_functions_of_damping(quantities);
    return quantities;
}

Quantities quantities_from(const Estimate& natural_frequency_estimate, const Estimate& damping_ratio_estimate,
                           double correlation, double confidence_level) {
    Quantities quantities;
    quantities[Quantity::natural_frequency] = natural_frequency_estimate;
    quantities[Quantity::damping_ratio] = damping_ratio_estimate;
    const Oscillator at =
        Oscillator::from(damping_ratio_estimate.value, two_pi * natural_frequency_estimate.value);
    const Vector2d unit(1.0 / std::cosh(at.asinh_damping), 1.0 / natural_frequency_estimate.value);
    const Vector2d deviation(damping_ratio_estimate.standard_uncertainty * unit(0),
                             natural_frequency_estimate.standard_uncertainty * unit(1));
    Matrix2d covariance;
    covariance << deviation(0) * deviation(0), correlation * deviation(0) * deviation(1),
        correlation * deviation(0) * deviation(1), deviation(1) * deviation(1);
    for (const Derived& derived : basic) {
        if (quantities.contains(derived.quantity) || !exists(derived, at)) continue;
        const Vector2d gradient = gradient_of(derived, at);
        const Spread spread{std::sqrt(gradient.dot(covariance * gradient)),
                            std::min(natural_frequency_estimate.degrees_of_freedom,
                                     damping_ratio_estimate.degrees_of_freedom)};
        quantities[derived.quantity] = straight_estimate(derived, at, spread, confidence_level);
    }
    add_functions_of_damping(quantities);
    return quantities;
}

}  // namespace ringwright::identify
